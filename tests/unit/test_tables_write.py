"""Tables keep every digit, type and unit, and do no harm in a spreadsheet."""

import csv
import math

import numpy as np
import pandas as pd
import pyarrow.parquet as pq
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scission.tables import COLUMNS, frame, write_tables
from scission.tables.frame import plain_text

DESIGN = {
    "points": "scan level point coordinate_angstrom status energy_hartree flag reasons attempts wall_s",
    "diagnostics": "scan level point coordinate_angstrom diagnostic value threshold over",
    "fits": "scan level model quantity value stderr unit",
    "onsets": "scan level diagnostic onset_angstrom lower_angstrom upper_angstrom",
    "crossings": "scan level from_angstrom to_angstrom overlap energy_step_hartree what",
    "comparison": "scan level reference_level quantity value unit",
    "scorecard": "diagnostic threshold hits false_alarms best_threshold",
    "failures": "scan level point coordinate_angstrom stage status reason message attempts remedy",
}

A_POINT = {
    "scan": "one-oh",
    "level": "cc",
    "point": 3,
    "coordinate_angstrom": 0.1 + 0.2,
    "status": "converged",
    "energy_hartree": -76.02414562789012,
    "attempts": 1,
    "reasons": "D2 0.21 > 0.18, T1 \u00e5",
}


@pytest.mark.parametrize("table", DESIGN)
def test_the_agreed_columns_come_first(table):
    """Readers may rely on the names and the order that the design fixes."""
    agreed = DESIGN[table].split()

    assert [column.name for column in COLUMNS[table]][: len(agreed)] == agreed


@pytest.mark.parametrize("table", COLUMNS)
def test_every_column_has_type_unit_and_meaning(table):
    """Nothing in a table is left to guess, and no name comes twice."""
    names = [column.name for column in COLUMNS[table]]

    assert len(names) == len(set(names))
    for column in COLUMNS[table]:
        assert column.dtype in ("str", "float", "int", "bool")
        assert column.unit
        assert column.meaning


@pytest.mark.parametrize("table", COLUMNS)
def test_an_empty_table_still_has_its_columns_and_types(tmp_path, table):
    """No rows is a result; both files say so in the same words."""
    write_tables({table: frame(table, [])}, tmp_path)
    path = next(tmp_path.rglob(f"{table}.csv"))

    assert path.read_text().strip().split(",") == [column.name for column in COLUMNS[table]]


def test_csv_and_parquet_hold_the_same(tmp_path):
    """Read back with pandas, both give the numbers that went in, to the last bit."""
    write_tables({"points": frame("points", [A_POINT])}, tmp_path)
    text = pd.read_csv(tmp_path / "tables/points.csv")
    typed = pd.read_parquet(tmp_path / "tables/points.parquet")

    for column in ("coordinate_angstrom", "energy_hartree"):
        assert text[column][0] == typed[column][0] == A_POINT[column]
    assert text.reasons[0] == typed.reasons[0] == A_POINT["reasons"]
    assert math.isnan(text.wall_s[0])
    assert typed.wall_s.isna()[0]


def test_the_csv_is_plain(tmp_path):
    """UTF-8 without a mark, commas, bare line feeds, nothing for a missing value."""
    write_tables({"points": frame("points", [A_POINT])}, tmp_path)
    data = (tmp_path / "tables/points.csv").read_bytes()

    assert data.startswith(b"scan,level,point,")
    assert b"\r" not in data
    assert b"nan" not in data.lower()
    assert b"0.30000000000000004,converged,-76.02414562789012,," in data


def test_parquet_columns_carry_their_unit(tmp_path):
    """A program learns the unit from the file."""
    write_tables({"points": frame("points", [A_POINT])}, tmp_path)
    schema = pq.read_schema(tmp_path / "tables/points.parquet")

    assert schema.field("energy_hartree").metadata[b"unit"] == b"hartree"
    assert str(schema.field("attempts").type) == "int64"


@given(st.floats(allow_nan=False, allow_infinity=False))
def test_every_double_survives_the_csv(tmp_path_factory, value):
    """Full double precision means bit by bit."""
    folder = tmp_path_factory.mktemp("t")
    write_tables({"fits": frame("fits", [{"scan": "s", "value": value}])}, folder)
    with (folder / "tables/fits.csv").open(newline="") as handle:
        row = next(csv.DictReader(handle))

    assert float(row["value"]) == value


@pytest.mark.parametrize("text", ["=1+1", "+1", "-1+1", "@SUM(A1)", "\t=1", " =1", "\r=1"])
def test_no_cell_is_a_formula(text):
    """A message from elsewhere stays text when a spreadsheet opens the file."""
    assert plain_text(text)[0] == "'"


def test_a_negative_energy_is_a_number(tmp_path):
    """The guard against formulas does not touch numbers."""
    write_tables({"states": frame("states", [{"scan": "s", "energy_hartree": -1.5}])}, tmp_path)

    assert (tmp_path / "tables/states.csv").read_text().endswith(",-1.5\n")


def test_a_column_that_is_not_listed_is_refused():
    """A table cannot grow in silence."""
    with pytest.raises(ValueError, match="points has no column energy"):
        frame("points", [{"energy": np.float64(1)}])
