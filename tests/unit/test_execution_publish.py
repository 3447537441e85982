"""Points that are nothing but their reference."""

from scission.execution.ledger import Ledger
from scission.execution.publish import publish
from scission.records.store import Record

ITEM = {"key": "point", "reference_key": "reference"}


def reference(**more):
    """A converged reference, the same numbers whatever is added."""
    return Record(
        "reference", "reference", "converged", scalars={"energy": -1.0, "wall_s": 0.1}, stamp="s", **more
    )


def test_diagnostics_that_come_later_reach_the_point(tmp_path):
    """An attempt that was killed before the diagnostics is finished by the next, without another energy."""
    store = Ledger(tmp_path, {})
    store.write(reference())
    publish(ITEM, store)
    store.write(reference(diagnostics={"s2": 0.5}))
    publish(ITEM, store)

    assert store.read("point", "point").diagnostics == {"s2": 0.5}


def test_a_point_that_says_the_same_is_not_written_again(tmp_path):
    """Publishing again costs nothing and changes no time."""
    store = Ledger(tmp_path, {})
    store.write(reference(diagnostics={"s2": 0.5}, notes={"start": "atoms"}))
    publish(ITEM, store)
    written = store.path("point", "point").stat().st_mtime_ns
    publish(ITEM, store)

    assert store.path("point", "point").stat().st_mtime_ns == written
