"""Damage to a record file is found by checksum, set aside and never read as a number."""

import io
import json
import os
import zipfile

import numpy as np
import pytest
from scission.records.store import Record, Store

KEY = "c0ffee"


@pytest.fixture
def store(tmp_path):
    store = Store(tmp_path)
    store.write(
        Record(
            KEY,
            "point",
            "converged",
            scalars={"energy": -76.25},
            arrays={"positions": np.linspace(0.0, 1.0, 30).reshape(10, 3)},
        )
    )
    return store


def original(store):
    return store.path("point", KEY).read_bytes()


def test_no_flipped_bit_changes_what_is_read(store):
    """Every single-bit error either is set aside or leaves every number as it was."""
    data = original(store)
    path = store.path("point", KEY)
    generator = np.random.default_rng(23)
    seen = {"aside": 0, "same": 0}
    for bit in generator.choice(len(data) * 8, size=600, replace=False):
        broken = bytearray(data)
        broken[bit // 8] ^= 1 << (bit % 8)
        path.write_bytes(broken)
        record = store.read("point", KEY)
        if record is None:
            seen["aside"] += 1
        else:
            assert record.scalars == {"energy": -76.25}
            assert np.array_equal(record.arrays["positions"].ravel(), np.linspace(0.0, 1.0, 30))
            seen["same"] += 1

    assert seen["aside"] > 5 * seen["same"]


@pytest.mark.parametrize("share", [0.0, 0.01, 0.3, 0.7, 0.95, 0.999])
def test_a_truncated_record_is_set_aside(store, share):
    """Whatever length was left, the record counts as absent and the file is kept for inspection."""
    data = original(store)
    store.path("point", KEY).write_bytes(data[: int(share * len(data))])

    assert store.read("point", KEY) is None
    assert store.keys("point") == set()
    assert (store.folder / "damaged" / f"records-{KEY}.npz").exists()
    assert KEY in (store.folder / "damaged" / "log.txt").read_text()


def test_damage_is_computed_again_and_kept_apart_each_time(store):
    """A second damaged file does not overwrite the first one; a new record is read as usual."""
    good = original(store)
    path = store.path("point", KEY)
    for _ in range(2):
        path.write_bytes(b"garbage")
        assert store.read("point", KEY) is None
    path.write_bytes(good)

    assert store.read("point", KEY).scalars == {"energy": -76.25}
    assert len(list((store.folder / "damaged").glob("*.npz"))) == 2


def test_a_record_under_another_name_is_not_believed(store):
    """A file copied to another key does not become that point's result."""
    other = store.path("point", "c0ffff")
    other.write_bytes(original(store))

    assert store.read("point", "c0ffff") is None
    assert store.read("point", KEY) is not None


@pytest.mark.parametrize(
    "change", [{"scalars": 5}, {"history": {}}, {"attempts": "1"}, {"message": None}, {"arrays": 3}]
)
def test_a_well_formed_archive_with_a_malformed_head_is_damage(store, change):
    """Somebody else's archive with fields of the wrong type raises nothing and is set aside."""
    with zipfile.ZipFile(io.BytesIO(original(store))) as archive:
        head = json.loads(archive.read("record.json")) | change
        positions = archive.read("positions.npy")
    with zipfile.ZipFile(store.path("point", KEY), "w") as archive:
        archive.writestr("record.json", json.dumps(head))
        archive.writestr("positions.npy", positions)

    assert store.read("point", KEY) is None


def test_an_archive_bomb_is_refused_unread(store):
    """A member that would unpack to far more than the file holds is damage."""
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("record.json", b" " * 50_000_000)
    store.path("point", KEY).write_bytes(buffer.getvalue())

    assert store.read("point", KEY) is None


@pytest.mark.parametrize(
    "head",
    [
        b"{'descr': '<f8', 'fortran_order': False, 'shape': (99999999999, 3)}",
        b"{'descr': '|O', 'fortran_order': False, 'shape': (1,)}",
        b"__import__('os').system('true')",
        b"[]",
        b"{'descr': '<f8', 'fortran_order': False, 'shape': (-1, 3)}",
    ],
)
def test_an_array_that_lies_about_itself_is_damage(store, head):
    """Size, type and header are checked before memory is taken; nothing is evaluated."""
    body = b"\x93NUMPY\x01\x00" + len(head).to_bytes(2, "little") + head + b"\0" * 8
    buffer = io.BytesIO(original(store))
    with zipfile.ZipFile(buffer, "a") as archive:
        archive.writestr("dipole.npy", body)
    store.path("point", KEY).write_bytes(buffer.getvalue())

    assert store.read("point", KEY) is None


def test_a_file_that_cannot_be_opened_is_not_called_damaged(store):
    """Trouble with the file system says nothing about the record and is raised."""
    path = store.path("point", KEY)
    path.unlink()
    path.mkdir()

    with pytest.raises(OSError, match=os.strerror(21)):
        store.read("point", KEY)


def test_a_record_of_another_layout_is_not_set_aside(store, monkeypatch):
    """A record that a newer version wrote is named, not thrown away."""
    monkeypatch.setattr("scission.records.store.SCHEMA_VERSION", 99)

    with pytest.raises(ValueError, match="layout version 1"):
        store.read("point", KEY)
    assert store.keys("point") == {KEY}


@pytest.mark.parametrize("scalars", [{"energy": None}, {}])
def test_a_converged_record_without_a_number_is_read_as_failed(store, scalars):
    """Whoever wrote it, with all checksums right: an energy that is none never counts as converged."""
    with zipfile.ZipFile(io.BytesIO(original(store))) as archive:
        head = json.loads(archive.read("record.json")) | {"scalars": scalars}
        positions = archive.read("positions.npy")
    with zipfile.ZipFile(store.path("point", KEY), "w") as archive:
        archive.writestr("record.json", json.dumps(head))
        archive.writestr("positions.npy", positions)
    record = store.read("point", KEY)

    assert (record.status, record.reason) == ("failed", "not-finite")
    assert record.message.startswith("energy: not a finite number")
