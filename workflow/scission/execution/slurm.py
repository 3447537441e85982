"""Slurm's queue: which jobs of a run are in it, and taking them out of it."""

from __future__ import annotations

import os
import subprocess
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

_FORMAT = "%i|%T|%u|%j|%k"
_LIMIT_S = 60.0
_WAITING = frozenset({"PENDING", "REQUEUED", "REQUEUE_HOLD", "REQUEUE_FED", "SPECIAL_EXIT", "RESV_DEL_HOLD"})
_FILTERS = ("SQUEUE_", "SCANCEL_")
"""Variables with which a person narrows what the commands see; none of that may hide a job here."""


class QueueError(Exception):
    """The queue cannot be asked or changed; the message says why."""


@dataclass(frozen=True)
class QueuedJob:
    """One job in the queue: number, state, owner, the run's name, and what it is for."""

    id: str
    state: str
    user: str
    name: str
    comment: str

    @property
    def is_waiting(self) -> bool:
        """Whether it has not started, so that nothing is lost by taking it out."""
        return self.state in _WAITING

    def __str__(self) -> str:
        what = self.comment.rpartition("_wildcards_")[2].removeprefix("rule_") or "job"
        return f"{what} (Slurm job {self.id} of {self.user}, {self.state.lower()})"


def listing() -> list[QueuedJob]:
    """Return all jobs that wait or run, of all users that may be seen.

    Raises:
        QueueError: squeue is missing, does not answer, or says something else than a list of jobs.
    """
    text = _call(["squeue", "--noheader", f"--format={_FORMAT}"])
    return [_parsed(line) for line in text.splitlines() if line.strip()]


def _parsed(line: str) -> QueuedJob:
    parts = [part.strip() for part in line.split("|", 4)]
    if len(parts) != 5:
        raise QueueError(f"squeue said {line!r} where a job was expected")
    return QueuedJob(*parts)


def cancel(jobs: Iterable[QueuedJob], *options: str) -> None:
    """Take jobs out of the queue, or send them a signal; ``options`` are those of scancel.

    Raises:
        QueueError: scancel is missing or refuses, as for the jobs of somebody else.
    """
    _call(["scancel", *options, *(job.id for job in jobs)])


def _call(words: Sequence[str]) -> str:
    environment = {name: value for name, value in os.environ.items() if not name.startswith(_FILTERS)}
    try:
        done = subprocess.run(
            words, env=environment, capture_output=True, text=True, timeout=_LIMIT_S, check=False
        )
    except FileNotFoundError:
        raise QueueError(f"{words[0]} is not to be found on this machine") from None
    except (OSError, subprocess.TimeoutExpired) as error:
        raise QueueError(f"{words[0]}: {error}") from None
    if done.returncode == 0:
        return done.stdout
    said = " ".join(done.stderr.split()) or "no reason given"
    raise QueueError(f"{words[0]} ended with status {done.returncode}: {said}")
