"""Tables back from their files, with the types they were written with."""

from __future__ import annotations

from pathlib import Path

import pandas as pd
import pyarrow as pa
import pyarrow.parquet as pq

from scission.tables.columns import COLUMNS
from scission.tables.write import FAILURES

_FROM_ARROW = {pa.int64(): pd.Int64Dtype(), pa.bool_(): pd.BooleanDtype()}


def read_tables(folder: Path) -> dict[str, pd.DataFrame]:
    """Frames of all tables below a campaign's folder, as ``write_tables`` was given them.

    Raises:
        OSError: a table is missing or cannot be read.
    """
    return {name: _failures(folder) if name == FAILURES else _read(name, folder) for name in COLUMNS}


def _read(name: str, folder: Path) -> pd.DataFrame:
    table = pq.read_table(folder / "tables" / f"{name}.parquet")
    return _typed(name, table.to_pandas(types_mapper=_FROM_ARROW.get))


def _failures(folder: Path) -> pd.DataFrame:
    words = {column.name: "str" for column in COLUMNS[FAILURES] if column.dtype == "str"}
    return _typed(
        FAILURES, pd.read_csv(folder / f"{FAILURES}.csv", dtype=words, keep_default_na=False, na_values={})
    )


def _typed(name: str, table: pd.DataFrame) -> pd.DataFrame:
    return table.astype({column.name: column.pandas_dtype for column in COLUMNS[name]})
