"""The store keeps whole records and says clearly what it will not keep."""

import errno
import json
import multiprocessing
import os
import zipfile

import numpy as np
import pytest
from scission.records.atomic import replacing
from scission.records.schema import ARRAYS, SCALARS
from scission.records.store import Record, Store
from scission.records.validate import settled


def a_record(key: str = "ab12cd", **changes) -> Record:
    values = {
        "key": key,
        "kind": "point",
        "status": "converged",
        "stage": "correlate",
        "scalars": {"energy": -1.1, "n_basis": 4},
        "diagnostics": {"t1": 0.01},
        "absent": {"luno": "no active space"},
        "inputs": {"symbols": ["H", "H"]},
        "arrays": {"positions": np.arange(6.0).reshape(2, 3)},
    }
    return Record(**(values | changes))


def test_a_record_comes_back_as_it_was_written(tmp_path):
    """Every field and array survives the round trip bit by bit."""
    store = Store(tmp_path)
    record = a_record(history=[{"attempt": 1, "status": "failed", "energy": None}], attempts=2)

    store.write(record)
    back = store.read("point", record.key)

    assert np.array_equal(back.arrays.pop("positions"), record.arrays.pop("positions"))
    assert back == record


def test_only_the_arrays_asked_for_are_read(tmp_path):
    """``arrays`` chooses what is taken from the file."""
    store = Store(tmp_path)
    store.write(a_record(arrays={"positions": np.zeros((2, 3)), "dipole": np.zeros(3)}))

    assert store.read("point", "ab12cd", arrays=False).arrays == {}
    assert set(store.read("point", "ab12cd", arrays=("dipole", "ci")).arrays) == {"dipole"}


@pytest.mark.parametrize("order", ["C", "F"])
def test_numpy_alone_reads_the_arrays(tmp_path, order):
    """A record is an ordinary npz file, in whatever memory order the array was."""
    array = np.asarray(np.random.default_rng(1).normal(size=(2, 3)), order=order)
    path = Store(tmp_path).write(a_record(arrays={"positions": array}))

    with np.load(path, allow_pickle=False) as archive:
        assert np.array_equal(archive["positions"], array)
    assert np.array_equal(Store(tmp_path).read("point", "ab12cd").arrays["positions"], array)


def test_any_zip_tool_reads_the_words(tmp_path):
    """The head is strict JSON: a value that is not finite in a failed record is null."""
    record = a_record(status="failed", reason="not-finite", scalars={"energy": float("nan")})
    path = Store(tmp_path).write(record)

    with zipfile.ZipFile(path) as archive:
        head = json.loads(archive.read("record.json"), parse_constant=pytest.fail)

    assert head["scalars"] == {"energy": None}
    assert np.isnan(Store(tmp_path).read("point", "ab12cd").scalars["energy"])


def test_the_same_record_gives_the_same_bytes(tmp_path):
    """No time of writing is hidden in the file."""
    first = Store(tmp_path / "a").write(a_record()).read_bytes()
    second = Store(tmp_path / "b").write(a_record()).read_bytes()

    assert first == second


@pytest.mark.parametrize(
    ("changes", "rule"),
    [
        ({"status": "done"}, "status 'done' is not one of"),
        ({"status": "failed", "reason": "bad luck"}, "reason 'bad luck' is not one of"),
        ({"scalars": {"energy": 1.0, "energie": 2.0}}, "'energie' is not in the schema"),
        ({"scalars": {"energy": float("inf")}}, "energy is not finite"),
        ({"scalars": {}}, "converged point without energy"),
        ({"diagnostics": {"t1": float("nan")}}, "t1 is not finite"),
        ({"arrays": {"dipole": np.array([0.0, np.nan, 0.0])}}, "dipole is not finite"),
        ({"arrays": {"moment": np.zeros(3)}}, "'moment' is not in the schema"),
        ({"arrays": {"dipole": np.zeros((3, 3))}}, "shape (3, 3)"),
        ({"arrays": {"dipole": np.array([None] * 3)}}, "dtype object"),
        ({"attempts": 0}, "attempts is 0"),
    ],
)
def test_a_record_outside_the_schema_is_refused(tmp_path, changes, rule):
    """The error names the field and the rule, and nothing is written."""
    store = Store(tmp_path)

    with pytest.raises(ValueError, match="record ab12cd") as caught:
        store.write(a_record(**changes))

    assert rule in str(caught.value)
    assert store.keys("point") == set()


def test_a_converged_calculation_with_a_nan_becomes_a_failure():
    """``settled`` names what is not a number; a clean record passes unchanged."""
    bad = settled(a_record(scalars={"energy": float("nan"), "n_basis": 4}))
    good = a_record()

    assert (bad.status, bad.reason) == ("failed", "not-finite")
    assert bad.message.startswith("energy: not a finite number")
    assert settled(good) is good


def test_messages_are_kept_as_one_line_of_ascii(tmp_path):
    """Whatever an engine prints, tables stay one row a point."""
    store = Store(tmp_path)
    store.write(a_record(status="failed", reason="raised", message="first\nsecond \u00e9 " + "x" * 900))

    message = store.read("point", "ab12cd").message

    assert message.startswith("first second \\xe9 ")
    assert len(message) == 500


@pytest.mark.parametrize("key", ["../../etc", "a", "a/b", "", ".hidden", "k" * 130, "ab\n"])
def test_an_unsafe_key_is_no_file_name(tmp_path, key):
    """No key leads out of the folder."""
    with pytest.raises(ValueError, match="record key"):
        Store(tmp_path).path("point", key)


def test_keys_come_from_names_and_ignore_what_a_killed_writer_left(tmp_path):
    """A leftover temporary file is not a record."""
    store = Store(tmp_path)
    path = store.write(a_record())
    path.with_name(".ab12cd.npz.1-aa.part").write_bytes(b"half")

    assert store.keys("point") == {"ab12cd"}
    assert store.keys("reference") == set()


def _write_often(folder: str, energy: float) -> None:
    store = Store(folder)
    for _ in range(30):
        store.write(a_record(scalars={"energy": energy}))


def test_two_writers_leave_one_whole_record(tmp_path):
    """Processes writing the same key never mix their bytes and leave nothing else behind."""
    context = multiprocessing.get_context("spawn")
    writers = [context.Process(target=_write_often, args=(str(tmp_path), e)) for e in (-1.0, -2.0)]
    for writer in writers:
        writer.start()
    for writer in writers:
        writer.join(30)

    assert Store(tmp_path).read("point", "ab12cd").scalars["energy"] in (-1.0, -2.0)
    assert [p.name for p in tmp_path.rglob("*") if p.is_file()] == ["ab12cd.npz"]


@pytest.mark.parametrize("call", ["fsync", "replace"])
def test_a_full_disk_is_a_clear_error_and_keeps_the_old_record(tmp_path, monkeypatch, call):
    """ENOSPC names the path and what to do; the earlier record stays and no litter remains."""
    store = Store(tmp_path)
    path = store.write(a_record())

    def full(*_):
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    monkeypatch.setattr(os, call, full)
    with pytest.raises(OSError, match="No space left") as caught:
        store.write(a_record(scalars={"energy": -9.0}))
    monkeypatch.undo()

    assert caught.value.errno == errno.ENOSPC
    assert str(path) in str(caught.value)
    assert store.read("point", "ab12cd").scalars["energy"] == -1.1
    assert [p.name for p in path.parent.iterdir()] == [path.name]


def test_a_really_full_file_system_is_a_clear_error(tmp_path):
    """The kernel's own full device, not a pretended one, gives the same error."""
    with (
        pytest.raises(OSError, match="No space left"),
        replacing(tmp_path / "x"),
        open("/dev/full", "wb", buffering=0) as handle,
    ):
        handle.write(b"data")

    assert list(tmp_path.iterdir()) == []


def test_a_place_that_is_no_folder_is_a_clear_error(tmp_path):
    """Also for root, whom permissions do not stop."""
    (tmp_path / "records").write_text("in the way")

    with pytest.raises(OSError, match=r"cannot write .*ab12cd\.npz"):
        Store(tmp_path).write(a_record())


def test_the_schema_has_no_name_twice():
    """Scalars and arrays share one space of names."""
    names = [item.name for item in SCALARS + ARRAYS]

    assert len(names) == len(set(names))
