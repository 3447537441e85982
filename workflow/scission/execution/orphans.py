"""What an earlier run left behind when it was killed: its engine, jobs in Slurm's queue, workers.

Nothing is computed twice: jobs that did not start are taken out of the queue, since the next run submits
them again; jobs at work are waited for, since their workers write records as they go.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Iterable
from dataclasses import dataclass, field
from typing import Any

from scission.execution import slurm
from scission.execution.layout import Layout, read_json
from scission.execution.markers import live_workers
from scission.execution.processes import is_alive, is_local
from scission.execution.slurm import QueuedJob, QueueError

_TRIES = 3
_BETWEEN_TRIES_S = 2.0
_LOOK_EVERY_S = 10.0
_TELL_EVERY_S = 60.0
_GRACE_S = 20.0
"""A worker that is told to stop (SIGINT) needs a moment; then the scheduler ends its job."""
_NAMED = 5


class OrphansError(Exception):
    """It cannot be told whether an earlier run still is at work; the message says what to do."""


@dataclass
class Settling:
    """Dealing with what is left of earlier runs of one campaign.

    Args:
        left: what the run file says of the latest run (see ``runfile``).
        tell: is given each line for a person.
        tick: called twice a second meanwhile.
        policy: for jobs at work in the queue: "wait" for them, "cancel" them, or trust a person who
            says that there are "none".
    """

    layout: Layout
    left: dict[str, Any]
    tell: Callable[[str], None]
    tick: Callable[[], None] = lambda: None
    policy: str = "wait"
    _told: dict[str, float] = field(default_factory=dict)
    _signalled: dict[str, float] = field(default_factory=dict)

    def settle(self, queue_name: str = "") -> None:
        """Return when nothing of an earlier run is at work any more, with the engine's lock freed.

        Args:
            queue_name: how the names of the runs' jobs in Slurm begin, "" if none ran there.

        Raises:
            OrphansError: the queue cannot be asked although jobs may be in it.
        """
        self._follow_engine()
        if queue_name and self.policy != "none":
            self.empty_queue(queue_name)
        self._wait_for_workers()
        _unlock(self.layout)

    def empty_queue(self, name: str) -> None:
        """Cancel the jobs of that name which wait, and see off those at work.

        Raises:
            OrphansError: see ``settle``.
        """
        seen = self._first_look(name)
        pause = 1.0
        while jobs := [job for job in seen or () if job.name.startswith(f"{name}_")]:
            self._take_out([job for job in jobs if job.is_waiting])
            self._see_off([job for job in jobs if not job.is_waiting])
            self._pause(pause)
            pause = min(2.0 * pause, _LOOK_EVERY_S)
            seen = self._look_again(seen or [])
        if seen is not None:
            self._void_claims({job.id for job in seen})

    def _first_look(self, name: str) -> list[QueuedJob] | None:
        """Return the queue; None if it cannot be asked and there is no sign that jobs are left in it."""
        for attempt in range(_TRIES):
            try:
                return slurm.listing()
            except QueueError as error:
                trouble = str(error)
            if attempt < _TRIES - 1:
                time.sleep(_BETWEEN_TRIES_S)
        at_work = live_workers(self.layout)
        if "pid" not in self.left and not at_work:
            self._say(
                f"Slurm's queue cannot be asked ({trouble}); the latest run ended properly, so going on"
            )
            return None
        signs = f"; workers that give signs of life: {_listed(at_work)}" if at_work else ""
        raise OrphansError(
            f"an earlier run was killed and may have jobs in Slurm's queue (their names begin with {name}), "
            f"but the queue cannot be asked: {trouble}{signs}.  Start again where squeue answers; or, if you "
            "know that none of these jobs is left, say so with --orphans none"
        )

    def _look_again(self, before: list[QueuedJob]) -> list[QueuedJob]:
        try:
            return slurm.listing()
        except QueueError as error:
            self._say(f"Slurm's queue cannot be asked at present, trying again: {error}")
            return before

    def _take_out(self, jobs: list[QueuedJob]) -> None:
        if jobs:
            self._say(f"cancelling what an earlier run left in the queue, not started yet: {_listed(jobs)}")
            self._cancel(jobs, "--state=PENDING")  # one that starts at this moment goes on

    def _see_off(self, jobs: list[QueuedJob]) -> None:
        if not jobs:
            return
        if self.policy != "cancel":
            self._say(
                f"waiting for what an earlier run left at work: {_listed(jobs)} "
                "(its results are kept; --orphans cancel would end it)"
            )
            return
        self._say(f"ending what an earlier run left at work: {_listed(jobs)}")
        now = time.monotonic()
        self._cancel([job for job in jobs if job.id not in self._signalled], "--signal=INT")
        self._cancel([job for job in jobs if now > self._signalled.get(job.id, now) + _GRACE_S])
        self._signalled |= {job.id: now for job in jobs if job.id not in self._signalled}

    def _cancel(self, jobs: list[QueuedJob], *options: str) -> None:
        try:
            if jobs:
                slurm.cancel(jobs, *options)
        except QueueError as error:
            self._say(f"not all of these jobs could be cancelled, waiting for them: {error}")

    def _void_claims(self, queued: set[str]) -> None:
        """Remove the claims of Slurm jobs that are gone; nobody needs to wait until they are stale."""
        for path in self.layout.worker("x").parent.glob("[!.]*.json"):
            holder = read_json(path) or {}
            if not is_local(holder) and holder.get("slurm_job", "") not in {"", *queued}:
                path.unlink(missing_ok=True)

    def _follow_engine(self) -> None:
        engine = self.left.get("engine") or {}
        if is_alive(engine):
            self._say(
                f"an earlier run was killed, its engine (process {engine['pid']}) is at work: following it"
            )
            while is_alive(engine):
                self._pause()

    def _wait_for_workers(self) -> None:
        while jobs := live_workers(self.layout):
            self._say(f"an earlier run was killed; waiting for what it left at work: {_listed(jobs)}")
            self._pause()

    def _say(self, words: str) -> None:
        """Tell, but not the same thing again and again."""
        if time.monotonic() - self._told.get(words, float("-inf")) > _TELL_EVERY_S:
            self._told[words] = time.monotonic()
            self.tell(words)

    def _pause(self, seconds: float = 0.5) -> None:
        end = time.monotonic() + seconds
        while time.monotonic() < end:
            self.tick()
            time.sleep(0.5)


def _listed(things: Iterable[object]) -> str:
    words = [str(thing) for thing in things]
    more = f" and {len(words) - _NAMED} more" if len(words) > _NAMED else ""
    return ", ".join(words[:_NAMED]) + more


def _unlock(layout: Layout) -> None:
    """Remove the engine's lock files: the run's own lock says that no engine is at work here."""
    locks = layout.folder / ".snakemake" / "locks"
    if locks.is_dir():
        for path in locks.iterdir():
            path.unlink()
