"""The published values that tests compare with; source and provenance are columns of each file."""

import csv
from pathlib import Path

DATA = Path(__file__).parent / "literature" / "data"


def rows(name, **wanted):
    """The rows of ``data/<name>.csv`` whose columns equal ``wanted``."""
    with (DATA / f"{name}.csv").open(encoding="utf-8", newline="") as handle:
        return [
            r for r in csv.DictReader(handle) if all(r[column] == text for column, text in wanted.items())
        ]


def value(name, **wanted):
    """The one value of ``data/<name>.csv`` whose columns equal ``wanted``."""
    (row,) = rows(name, **wanted)
    return float(row["value"])
