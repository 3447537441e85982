"""Tidy tables of a campaign: columns, frames, files.

``COLUMNS`` is the one list of what each table holds.  A new table is one entry there and one
function that yields its rows; files, types, units and documentation follow.
"""

from scission.tables.columns import COLUMNS, Column
from scission.tables.failures import FailureListError, FailureRow, read_failures
from scission.tables.frame import frame
from scission.tables.read import read_tables
from scission.tables.write import write_tables

__all__ = [
    "COLUMNS",
    "Column",
    "FailureListError",
    "FailureRow",
    "frame",
    "read_failures",
    "read_tables",
    "write_tables",
]
