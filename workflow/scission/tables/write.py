"""Tables on disk: CSV for eyes and spreadsheets, Parquet with types and units for programs."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import pandas as pd
import pyarrow as pa
import pyarrow.parquet as pq

from scission.records.atomic import replacing
from scission.tables.columns import COLUMNS, Column

FAILURES = "failures"

_ARROW = {"str": pa.string(), "float": pa.float64(), "int": pa.int64(), "bool": pa.bool_()}


def write_tables(frames: Mapping[str, pd.DataFrame], folder: Path) -> list[Path]:
    """Write ``tables/<name>.csv`` and ``.parquet``, and ``failures.csv``, below a campaign's folder.

    Each file appears whole or not at all.

    Raises:
        OSError: the folder cannot be written.
    """
    written = []
    for name, table in frames.items():
        home = folder if name == FAILURES else folder / "tables"
        written.append(write_csv(table, home / f"{name}.csv"))
        if name != FAILURES:
            written.append(write_parquet(name, table, home / f"{name}.parquet"))
    return written


def write_csv(table: pd.DataFrame, path: Path) -> Path:
    """UTF-8, comma, dot decimal, the shortest digits that give back every double, empty for missing."""
    with replacing(path) as temporary:
        table.to_csv(temporary, index=False, lineterminator="\n", encoding="utf-8")
    return path


def write_parquet(name: str, table: pd.DataFrame, path: Path) -> Path:
    """The same content, typed; each field carries its unit and meaning as metadata."""
    schema = pa.schema([_field(column) for column in COLUMNS[name]])
    with replacing(path) as temporary:
        pq.write_table(pa.Table.from_pandas(table, schema=schema, preserve_index=False), temporary)
    return path


def _field(column: Column) -> pa.Field:
    return pa.field(
        column.name, _ARROW[column.dtype], metadata={"unit": column.unit, "meaning": column.meaning}
    )
