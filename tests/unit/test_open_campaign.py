"""Results in other hands: frames, labelled arrays, extended XYZ, a data package, several campaigns."""

import csv
import hashlib
import json
import re
import subprocess
import sys

import numpy as np
import pandas as pd
import pyarrow.parquet as pq
import pytest
import scission
from scission.analysis import analyse
from scission.cli import main
from scission.diagnostics import DIAGNOSTICS
from scission.execution.layout import PROJECT
from scission.handover import write_package
from scission.records import Store
from scission.records.gather import gather
from scission.tables import COLUMNS, write_tables
from scission.units import ANGSTROM_IN_BOHR, HARTREE_IN_EV
from synthetic_campaign import campaign, fill, points, record

N_POINTS = 165


def finish(folder):
    """A campaign with all its results; all points but a few have a result, and a geometry."""
    store = Store(folder)
    fill(store)
    for point in points():
        if point.scan == "n-n" and point.number != 7:
            item = record(point)
            z = point.coordinate[0] * ANGSTROM_IN_BOHR
            item.arrays["positions"] = np.array([[0.0, 0.0, 0.0], [0.0, 0.0, z]])
            item.arrays["natural_occupations"] = np.array([1.9, 0.1])
            store.write(item)
    analysis = analyse(points(), campaign(folder), store, {"physics_version": 1, "digest": "abc"})
    gather(points(), store, folder / "campaign.h5", analysis.provenance, DIAGNOSTICS, analysis.flags)
    write_tables(analysis.frames, folder)
    (folder / "plan").mkdir()
    (folder / "plan" / "plan.json").write_text("{}")
    return folder


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    """Results of one campaign."""
    return finish(tmp_path_factory.mktemp("results") / "made-up")


@pytest.fixture(scope="module")
def opened(folder):
    """The same, opened."""
    return scission.open_campaign(folder)


@pytest.fixture(scope="module")
def other(tmp_path_factory):
    """A campaign of another name with the same content."""
    return scission.open_campaign(finish(tmp_path_factory.mktemp("more") / "other"))


def frames(path):
    """(number of atoms, comment as a mapping, rows) of every frame, by the format's definition."""
    lines = path.read_text().splitlines()
    while lines:
        n = int(lines[0])
        pairs = re.findall(r'(\w+)=("(?:[^"\\]|\\.)*"|\S+)', lines[1])
        yield n, {k: v.strip('"') for k, v in pairs}, [line.split() for line in lines[2 : 2 + n]]
        lines = lines[2 + n :]


def test_importing_the_package_loads_no_table_library():
    """Jobs import it all the time; pandas and xarray come with open_campaign."""
    program = "import sys, scission; print(sorted({'pandas', 'xarray', 'h5py', 'numpy'} & set(sys.modules)))"
    run = [sys.executable, "-c", program]

    assert subprocess.run(run, capture_output=True, text=True, check=True).stdout.strip() == "[]"
    with pytest.raises(AttributeError, match="no_such_thing"):
        _ = scission.no_such_thing


def test_frames_hold_every_cell_of_the_files(opened, folder):
    """Words and numbers to the last digit; missing where the cell is empty; the failure list as well."""
    read = {"str": str, "float": float, "int": int, "bool": lambda cell: cell == "True"}
    for name, table in opened.tables.items():
        path = folder / ("" if name == "failures" else "tables") / f"{name}.csv"
        with path.open(newline="") as handle:
            rows = list(csv.DictReader(handle))
        assert len(rows) == len(table)
        for column in COLUMNS[name]:
            words = column.dtype == "str"
            cells = [read[column.dtype](r[column.name]) if r[column.name] or words else None for r in rows]

            assert [None if pd.isna(v) else v for v in table[column.name]] == cells
    assert len(opened.points) == N_POINTS
    assert set(opened.failures["status"]) == {"unconverged", "lost"}


def test_columns_and_arrays_carry_their_units(opened):
    """As words in the frames' attrs and the datasets' attributes."""
    assert opened.points.attrs["units"]["energy_hartree"] == "hartree"
    assert opened.points.attrs["meanings"]["wall_s"] == "wall time of the calculation"
    assert opened.scans["h-f"]["energy"].attrs["units"] == "hartree"
    assert opened.scans["n-n"]["positions"].attrs["units"] == "bohr"


def test_frames_and_datasets_hold_the_same_energies(opened):
    """Two ways to one number."""
    table = opened.points.query("scan == 'h-f' and level == 'cas'")
    values = opened.scans["h-f"]["energy"].sel(level="cas").values

    np.testing.assert_array_equal(table["energy_hartree"].to_numpy(), values)


def test_arrays_of_a_level_are_labelled_by_point(opened):
    """Those whose size is the level's own; a level without any gives an empty set."""
    occupations = opened.level("n-n", "cas")["natural_occupations"]

    assert occupations.dims == ("point", "orbital")
    assert list(occupations["point"].values) == list(range(1, 26))
    assert not opened.level("h-f", "cas").data_vars
    with pytest.raises(KeyError, match="ccsd-t"):
        opened.level("h-f", "mp2")


def test_every_geometry_is_written_with_its_energy_and_flag(opened, tmp_path):
    """Lengths from the positions; energies in eV and hartree; none where the point has none."""
    path = tmp_path / "all.xyz"
    n = opened.write_extxyz(path)
    read = list(frames(path))
    flags = {(r.level, r.point): r.flag for r in opened.points.query("scan == 'n-n'").itertuples()}

    assert n == len(read) == 3 * 24  # of h-f no record tells the geometry, and of one point of n-n
    for atoms, head, rows in read:
        length = np.linalg.norm(np.array(rows[1][1:], float) - np.array(rows[0][1:], float))
        assert (atoms, rows[0][0], head["Properties"]) == (2, "N", "species:S:1:pos:R:3")
        assert float(head["coordinate_angstrom"]) == pytest.approx(length, abs=1e-9)
        assert float(head["energy"]) == pytest.approx(float(head["energy_hartree"]) * HARTREE_IN_EV)
        assert head["flag"] == flags[head["level"], int(head["point"])]


def test_campaigns_are_put_together_with_their_names(opened, other):
    """Tables get a first column, scans a prefix; every row is kept."""
    both = scission.concat([opened, other])

    assert list(both.points.columns[:2]) == ["campaign", "scan"]
    assert both.points["campaign"].value_counts().to_dict() == {"made-up": N_POINTS, "other": N_POINTS}
    assert "other/h-f" in both.scans
    with pytest.raises(ValueError, match="twice: other"):
        scission.concat([other, other])


def test_equal_campaigns_compare_equal(opened, other):
    """Point by point, by scan, level and length; zero wherever both have an energy."""
    table = scission.compare(opened, other)
    known = opened.points["energy_hartree"].notna().sum()

    assert len(table) == N_POINTS
    assert (table["difference_kcal_per_mol"] == 0.0).sum() == known


def test_the_package_describes_every_column_of_every_file(opened, tmp_path):
    """Names, order, types and units as in the list of columns; sizes and checksums as on disk."""
    write_package(opened, tmp_path, geometries=True)
    package = json.loads((tmp_path / "datapackage.json").read_text())

    assert package["profile"] == "tabular-data-package"
    assert {r["name"].replace("-", "_") for r in package["resources"]} == {*opened.tables, "geometries"}
    for resource in package["resources"]:
        data = (tmp_path / resource["path"]).read_bytes()
        assert resource["hash"] == f"sha256:{hashlib.sha256(data).hexdigest()}"
        assert resource["bytes"] == len(data)
        if resource["name"] != "geometries":
            with (tmp_path / resource["path"]).open(newline="") as handle:
                header = next(csv.reader(handle))
            fields = resource["schema"]["fields"]
            columns = COLUMNS[resource["name"].replace("-", "_")]
            assert [f["name"] for f in fields] == header == [c.name for c in columns]
            assert [f["unit"] for f in fields] == [c.unit for c in columns]


def test_values_parse_as_the_types_that_the_package_states(opened, tmp_path):
    """By the lexical rules of Table Schema: https://specs.frictionlessdata.io/table-schema/#types-and-formats."""
    legal = {
        "string": re.compile(r".*", re.DOTALL),
        "number": re.compile(r"[-+]?(\d+(\.\d*)?|\.\d+)([eE][-+]?\d+)?"),
        "integer": re.compile(r"[-+]?\d+"),
        "boolean": re.compile(r"true|True|TRUE|1|false|False|FALSE|0"),
    }
    write_package(opened, tmp_path)
    for resource in json.loads((tmp_path / "datapackage.json").read_text())["resources"]:
        types = {f["name"]: f["type"] for f in resource["schema"]["fields"]}
        with (tmp_path / resource["path"]).open(newline="") as handle:
            cells = [item for row in csv.DictReader(handle) for item in row.items() if item[1]]

        assert [(n, v) for n, v in cells if not legal[types[n]].fullmatch(v)] == []


def test_the_command_writes_csv_and_parquet_of_the_same_content(folder, opened, tmp_path, capsys):
    """CSV byte for byte that of the campaign; Parquet with units."""
    assert main(["tables", str(folder), "--to", str(tmp_path / "out")]) == 0
    assert "datapackage.json" in capsys.readouterr().out
    assert (tmp_path / "out/points.csv").read_bytes() == (folder / "tables/points.csv").read_bytes()
    schema = pq.read_schema(tmp_path / "out/points.parquet")
    assert schema.field("energy_hartree").metadata[b"unit"] == b"hartree"
    assert pq.read_metadata(tmp_path / "out/points.parquet").num_rows == len(opened.points)


def test_several_campaigns_become_one_package(folder, other, tmp_path):
    """The key of its points names the campaign first."""
    assert main(["tables", str(folder), str(other.folder), "--to", str(tmp_path)]) == 0
    package = json.loads((tmp_path / "datapackage.json").read_text())
    schema = next(r["schema"] for r in package["resources"] if r["name"] == "points")

    assert schema["primaryKey"] == ["campaign", "scan", "level", "point"]
    assert len(pd.read_csv(tmp_path / "points.csv")) == 2 * N_POINTS


def test_a_folder_without_results_is_told(tmp_path, capsys):
    """By the library and by the command, with what is missing."""
    with pytest.raises(FileNotFoundError, match=r"no campaign\.h5"):
        scission.open_campaign(tmp_path)
    assert main(["tables", str(tmp_path), "--to", str(tmp_path / "out")]) == 2
    assert str(tmp_path) in capsys.readouterr().err


def test_the_example_of_the_readme_runs(folder, tmp_path, monkeypatch, capsys):
    """Ten lines, with the names of the campaign at hand."""
    readme = (PROJECT / "README.md").read_text(encoding="utf-8")
    blocks = re.findall(r"^```python\n(.*?)^```", readme, re.MULTILINE | re.DOTALL)
    text = next(block for block in blocks if "open_campaign" in block)
    monkeypatch.chdir(tmp_path)

    assert len(text.strip().splitlines()) <= 10
    text = text.replace("results/demo", str(folder)).replace('"n2"', '"n-n"').replace('"cc"', '"ccsd-t"')
    exec(compile(text, "README.md", "exec"), {})
    assert "hartree" in capsys.readouterr().out
    assert list(frames(tmp_path / "demo.xyz"))
