"""Rows of plain values into a typed pandas frame with the columns of a table."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

import numpy as np
import pandas as pd

from scission.tables.columns import COLUMNS, Column

_FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r")


def frame(table: str, rows: Iterable[Mapping[str, Any]]) -> pd.DataFrame:
    """Typed frame of a table; a key that a row lacks is a missing value.

    Missing is NaN for numbers, <NA> for integers and truth values, "" for words.

    Raises:
        KeyError: no such table.
        ValueError: a row has a key that is not a column.
    """
    columns, listed = COLUMNS[table], list(rows)
    unknown = {key for row in listed for key in row} - {column.name for column in columns}
    if unknown:
        raise ValueError(f"table {table} has no column {', '.join(sorted(unknown))}")
    data = {column.name: _series(column, [row.get(column.name) for row in listed]) for column in columns}
    return pd.DataFrame(data)


def _series(column: Column, values: list[Any]) -> pd.Series:
    if column.dtype == "str":
        return pd.Series([plain_text(value) for value in values], dtype=column.pandas_dtype)
    missing = np.nan if column.dtype == "float" else pd.NA
    return pd.Series([missing if value is None else value for value in values], dtype=column.pandas_dtype)


def plain_text(value: object) -> str:
    """One line that no spreadsheet takes for a formula: a cell that could be one gains an apostrophe."""
    text = "" if value is None else " ".join(str(value).split())
    return f"'{text}" if text.startswith(_FORMULA_STARTS) else text
