"""Points of levels without correlation: their reference is the result, so it is copied, not computed."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from scission.execution.ledger import Ledger
from scission.records.schema import TOO_LARGE_TO_GATHER
from scission.records.store import Record


def publish(item: dict[str, Any], store: Ledger) -> Record:
    """Write the record of a point from its reference's record, whatever came of that; return it.

    A reference without a record leaves a failed point, so that the point has a fate in any case.
    """
    reference = store.read("reference", item["reference_key"])
    present = store.read("point", item["key"], arrays=False)
    if reference is None:
        words = f"reference {item['reference_key']} has no record"
        record = Record(item["key"], "point", "skipped", "reference-missing", words, stage="reference")
    else:
        record = _as_point(reference, item)
    record.reference_key = item["reference_key"]
    if present is None or _differs(present, record):
        store.write(record)
    return record


def _as_point(reference: Record, item: dict[str, Any]) -> Record:
    arrays = {name: array for name, array in reference.arrays.items() if name not in TOO_LARGE_TO_GATHER}
    own: dict[str, Any] = {
        name: item[name] for name in ("molecule", "spec", "correlation", "frozen_core") if name in item
    }
    return replace(
        reference,
        key=item["key"],
        kind="point",
        stage="reference",
        arrays=arrays,
        inputs={**reference.inputs, **own},
        reference_stamp=reference.stamp,
        history=[],
    )


def _differs(present: Record, new: Record) -> bool:
    # Not the stamp alone: a later attempt may have added the diagnostics that an earlier one was killed in.
    return _essence(present) != _essence(new)


def _essence(record: Record) -> tuple[Any, ...]:
    words = (record.status, record.reason, record.reference_stamp, record.attempts)
    return *words, record.diagnostics, record.absent, record.notes, record.scalars.keys()
