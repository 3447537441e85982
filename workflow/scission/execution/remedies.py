"""What to try next for a calculation that did not succeed: a short ladder for each kind of failure.

Contract for a new remedy: one entry in ``REMEDIES``, a place in ``LADDERS``, and the calculation that
acts on its name (``chemistry``), or a factor in ``FACTORS`` if it only takes more of the machine.
"""

from __future__ import annotations

from typing import NamedTuple

from scission.records.store import Record

REMEDIES = {
    "damping": "mix each iteration with the one before, so that oscillations die out",
    "level-shift": "shift the virtual orbitals up, so that occupied ones do not change places with them",
    "second-order": "use the second-order solver, which goes downhill only",
    "more-cycles": "allow many more iterations",
    "more-time": "give four times the time, and again at each further try",
    "more-memory": "give twice the memory, and again at each further try",
    "again": "the same once more, for failures that came from outside",
}


class Factors(NamedTuple):
    """By how much a job's grants grow with each try of a remedy."""

    time: float
    memory: float


FACTORS = {"more-time": Factors(4.0, 1.0), "more-memory": Factors(2.0, 2.0)}
_MOST = 64.0

LADDERS: dict[tuple[str, str], tuple[str, ...]] = {
    ("reference", "not-converged"): ("damping", "level-shift", "second-order"),
    ("correlate", "not-converged"): ("damping", "level-shift", "more-cycles"),
    ("reference", "not-finite"): ("damping", "level-shift", "second-order"),
    ("correlate", "not-finite"): ("damping", "level-shift"),
}
"""(stage, reason) -> remedies from the mildest to the strongest."""

_OF_REASON = {"time-limit": "more-time", "scheduler-limit": "more-time", "memory-limit": "more-memory"}


def next_remedy(record: Record) -> str:
    """Return the next stronger remedy for a record without a good result.

    That is the first rung of its ladder that no attempt has used; "again" where there is none left.
    """
    if record.reason in _OF_REASON:
        return _OF_REASON[record.reason]
    used = {record.remedy, *(entry.get("remedy", "") for entry in record.history)}
    ladder = LADDERS.get((record.stage, record.reason), ())
    return next((remedy for remedy in ladder if remedy not in used), "again")


def checked(remedy: str) -> str:
    """Return ``remedy``.

    Raises:
        ValueError: it is not known; the message lists those that are.
    """
    if remedy and remedy not in REMEDIES:
        raise ValueError(f"remedy {remedy!r} is not one of {', '.join(REMEDIES)}")
    return remedy


def factors(remedy: str, record: Record | None) -> Factors:
    """Return by how much time and memory grow for the next try of ``remedy`` after what ``record`` tells."""
    step = FACTORS.get(remedy)
    if step is None:
        return Factors(1.0, 1.0)
    requests = {e.get("request") for e in record.history if e.get("remedy") == remedy} if record else set()
    tries = 1 + len(requests) + (record is not None and record.remedy == remedy)
    return Factors(min(_MOST, step.time**tries), min(_MOST, step.memory**tries))
