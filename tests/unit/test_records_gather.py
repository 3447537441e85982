"""campaign.h5 says of every number what it is, and opens with labelled axes."""

import sys
from dataclasses import dataclass
from types import SimpleNamespace

import h5py
import numpy as np
import pytest
import xarray
from scission.records.gather import gather
from scission.records.recall import recall
from scission.records.schema import POINT_TEXTS, SCALARS
from scission.records.store import Record, Store

DIAGNOSTICS = {"t1": SimpleNamespace(unit="1", meaning="norm of the singles", source="Lee and Taylor (1989)")}


@dataclass(frozen=True)
class Planned:
    scan: str
    level: str
    number: int
    coordinate: tuple[float, ...]
    key: str
    names: tuple[str, ...] = ("length of the bond O1-H2",)


def planned(scan: str = "one-oh", n: int = 5) -> list[Planned]:
    return [
        Planned(scan, level, number, (0.5 * number,), f"{scan}-{level}-{number}")
        for level in ("cc", "cas")
        for number in range(1, n + 1)
    ]


def computed(point: Planned) -> Record:
    size = 2 + point.number if point.level == "cas" else 0
    arrays = {"positions": np.full((2, 3), point.coordinate[0]), "orbital_energies": np.ones((1, 4))}
    if size:
        arrays["natural_occupations"] = np.linspace(2, 0, size)
        arrays["mo_lowdin"] = np.zeros((1, 4, 4))
    return Record(
        point.key,
        "point",
        "converged",
        scalars={"energy": -point.coordinate[0], "n_basis": 4},
        diagnostics={"t1": 0.01 * point.number} if point.level == "cc" else {"luno": 0.1},
        inputs={"molecule": {"symbols": ["O", "H"]}},
        arrays=arrays,
    )


@pytest.fixture
def gathered(tmp_path):
    store = Store(tmp_path)
    points = planned()
    for point in points[:-2]:
        store.write(computed(point))
    failed = Record(
        points[-2].key,
        "point",
        "failed",
        reason="raised",
        message="no",
        scalars={"n_basis": float("nan"), "energy": -99.0},
    )
    store.write(failed)
    out = tmp_path / "campaign.h5"
    flags = {("one-oh", "cc", 2): ("multireference", "D2 0.21 > 0.18")}
    text = "campaign: x\n# \u00e5ngstr\u00f6m\n" + "# long\n" * 20_000
    gather(points, store, out, {"campaign_file": text, "physics_version": 1}, DIAGNOSTICS, flags)
    return out


def test_xarray_opens_a_scan_with_labels(gathered):
    """Levels are chosen by name, points by number, and the coordinate is a coordinate."""
    with xarray.open_dataset(gathered, engine="h5netcdf", group="scans/one-oh") as scan:
        assert scan.energy.dims == ("level", "point")
        assert list(scan.level.values) == ["cc", "cas"]
        assert scan.energy.sel(level="cc", point=3).item() == -1.5
        assert np.allclose(scan.energy.sel(level="cas").coordinate_angstrom, [0.5, 1.0, 1.5, 2.0, 2.5])
        assert list(scan.atom.values) == ["O1", "H2"]
        assert scan.positions.sel(point=2, atom="H2", xyz="z").item() == 1.0
        assert scan.flag.sel(level="cc", point=2).item() == "multireference"


def test_a_point_that_failed_or_vanished_has_a_row(gathered):
    """Missing numbers are NaN, words say why; an integer that is missing decodes to NaN."""
    with xarray.open_dataset(gathered, engine="h5netcdf", group="scans/one-oh") as scan:
        cas = scan.sel(level="cas")

        assert list(cas.status.values[-2:]) == ["failed", "lost"]
        assert list(cas.reason.values[-2:]) == ["raised", "lost"]
        assert np.isnan(cas.energy.values[-2:]).all()
        assert np.isnan(cas.n_basis.values[-2:]).all()
        assert list(cas.attempts.values) == [1, 1, 1, 1, 0]


def test_arrays_of_a_level_are_padded_with_nan(gathered):
    """An active space that differs from point to point still makes one array."""
    group = "scans/one-oh/levels/cas"
    with xarray.open_dataset(gathered, engine="h5netcdf", group=group) as level:
        assert level.natural_occupations.dims == ("point", "orbital")
        assert level.natural_occupations.shape == (5, 5)
        assert np.isfinite(level.natural_occupations).sum("orbital").values.tolist() == [3, 4, 5, 0, 0]
        assert "mo_lowdin" not in level


def test_every_number_has_unit_and_meaning(gathered):
    """h5py alone shows what each dataset is."""
    with h5py.File(gathered) as file:
        scan = file["scans/one-oh"]
        for item in SCALARS + POINT_TEXTS:
            assert scan[item.name].attrs["units"] == item.unit
            assert scan[item.name].attrs["long_name"] == item.meaning

        assert scan["t1"].attrs["source"] == "Lee and Taylor (1989)"
        assert scan["coordinate_angstrom"].attrs["units"] == "angstrom"
        assert scan["energy"].dims[1][0].name.endswith("/point")


def test_the_campaign_file_is_kept_as_given(gathered):
    """Also one far above the 64 KiB that old HDF5 layouts allow an attribute."""
    with h5py.File(gathered) as file:
        text = file.attrs["campaign_file"]

    assert text.startswith("campaign: x\n# \u00e5ngstr\u00f6m\n")
    assert len(text) > 140_000


def test_a_grid_of_two_coordinates_keeps_both(tmp_path):
    """Further components of the coordinate are variables along the points."""
    points = [Planned("grid", "cc", n, (n, 10.0 * n), f"grid-{n}", ("bond A", "bond B")) for n in (1, 2)]
    gather(points, Store(tmp_path), tmp_path / "c.h5", {})

    with h5py.File(tmp_path / "c.h5") as file:
        second = file["scans/grid/coordinate_2_angstrom"]
        assert list(second) == [10.0, 20.0]
        assert second.attrs["long_name"] == "bond B"


def test_a_level_may_be_named_like_a_variable(tmp_path):
    """Names given by the user never meet the names of the file."""
    points = [Planned("t1", name, 1, (1.0,), f"t1-{name}") for name in ("energy", "t1", "point", "level")]
    store = Store(tmp_path)
    for point in points:
        store.write(computed(point))
    gather(points, store, tmp_path / "c.h5", {})

    with xarray.open_dataset(tmp_path / "c.h5", engine="h5netcdf", group="scans/t1") as scan:
        assert scan.energy.sel(level="energy").item() == -1.0


def test_a_damaged_record_is_named_as_such(tmp_path):
    """The row says damaged, not only lost."""
    store = Store(tmp_path)
    point = planned(n=1)[0]
    store.write(computed(point)).write_bytes(b"PK garbage")
    gather([point], store, tmp_path / "c.h5", {})

    with h5py.File(tmp_path / "c.h5") as file:
        scan = file["scans/one-oh"]
        assert (scan["status"].asstr()[0, 0], scan["reason"].asstr()[0, 0]) == ("lost", "damaged")


def test_a_lost_point_counts_the_start_that_its_marker_tells(tmp_path):
    """A job that died after starting a calculation leaves the number of the attempt."""
    store = Store(tmp_path)
    point = planned(n=1)[0]
    (tmp_path / "running").mkdir()
    told = '{"attempt": 2, "started": "2031-05-06T07:08:09Z", "host": "node3", "job": "correlate.x"}'
    (tmp_path / "running" / f"{point.key}.json").write_text(told)
    gather([point], store, tmp_path / "c.h5", {})

    with h5py.File(tmp_path / "c.h5") as file:
        assert file["scans/one-oh/attempts"][0, 0] == 2
    words = "last started at 2031-05-06T07:08:09Z, on node3, in job correlate.x"
    assert recall(store, point.key).message == f"the job vanished and left nothing; {words}"


def test_an_interrupted_gather_leaves_the_old_file(tmp_path, monkeypatch):
    """The file changes in one step."""
    store = Store(tmp_path)
    out = tmp_path / "campaign.h5"
    gather(planned(), store, out, {"turn": 1})

    def broken(*_, **__):
        raise KeyboardInterrupt

    monkeypatch.setattr(sys.modules["scission.records.gather"], "recall_point", broken)
    with pytest.raises(KeyboardInterrupt):
        gather(planned(), store, out, {"turn": 2})

    with h5py.File(out) as file:
        assert file.attrs["turn"] == 1
    assert [p.name for p in tmp_path.iterdir()] == ["campaign.h5"]
