"""What a record that is there already calls for: nothing, or to be computed again."""

from __future__ import annotations

from typing import Any

from scission.execution.ledger import fulfilled
from scission.execution.outcomes import RESOURCE_REASONS
from scission.records.store import Record


def needs_again(
    record: Record, reference_stamp: str, job_attempt: int, request: dict[str, Any] | None
) -> bool:
    """Whether a point that has a record must be computed again.

    That is so when its reference has changed, a person asks for it, or it ran out of time or memory
    in an attempt that granted less.
    """
    if record.reference_stamp != reference_stamp or _asked(record, request):
        return True
    return is_short(record) and job_attempt > granted(record)


def is_short(record: Record) -> bool:
    """Whether the calculation ran out of time or memory."""
    return record.status == "failed" and record.reason in RESOURCE_REASONS


def granted(record: Record) -> int:
    """Return the engine's attempt that the record comes from; later ones are granted more."""
    return int(record.provenance.get("job_attempt", 1))


def same_skip(record: Record, reference_stamp: str, request: dict[str, Any] | None) -> bool:
    """Whether the record already says that this reference did not succeed."""
    return (
        record.status == "skipped"
        and record.reference_stamp == reference_stamp
        and not _asked(record, request)
    )


def _asked(record: Record, request: dict[str, Any] | None) -> bool:
    return request is not None and not fulfilled(record, request["id"])


def why_no_reference(key: str, reference: Record | None) -> str:
    """Return why the reference ``key`` cannot be built upon, in words."""
    if reference is None:
        return f"reference {key} has no record"
    return f"reference {key} is {reference.status}: {reference.message or reference.reason}"
