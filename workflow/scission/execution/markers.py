"""Small files beside the records: who computes what at present, and what shall be computed again."""

from __future__ import annotations

import os
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from scission.execution.layout import Layout, read_json, write_json
from scission.execution.processes import identity, is_alive, is_local, is_same


def now() -> str:
    """Return the time as UTC, ISO 8601, to the millisecond."""
    return datetime.now(UTC).isoformat(timespec="milliseconds").replace("+00:00", "Z")


def earlier_starts(layout: Layout, key: str) -> int:
    """Return how many starts a left-over marker counts: those that ended without a record."""
    marker = read_json(layout.running(key))
    return int(marker.get("attempt", 0)) if marker else 0


def mark_running(layout: Layout, key: str, attempt: int, job: str) -> None:
    """Say that the calculation of ``key`` is being started for the ``attempt``-th time."""
    marker = {"attempt": attempt, "job": job, "started": now(), **identity()}
    write_json(layout.running(key), marker, durable=False)  # after a loss of power nothing is running


def clear_running(layout: Layout, key: str) -> None:
    """Take the marker away; only after the record is in its place."""
    layout.running(key).unlink(missing_ok=True)


def pending_request(layout: Layout, key: str) -> dict[str, Any] | None:
    """Return the request to compute ``key`` again, if there is one."""
    return read_json(layout.request(key))


REFRESH_S = 20.0
"""How often a worker shows that it lives, to machines that do not see its process."""
STALE_AFTER_S = 120.0
"""A claim from another machine that was not refreshed for so long is taken for dead."""


class ClaimLostError(Exception):
    """Another worker has taken the job over; the message says who."""


@dataclass
class Claim:
    """A worker's claim on a job: a file that names it, refreshed for as long as it works."""

    path: Path
    who: dict[str, Any] = field(default_factory=lambda: identity() | _scheduler_job() | {"since": now()})
    _refreshed: float = field(default_factory=time.monotonic)

    def take(self) -> bool:
        """Make the file; False if there is one already."""
        try:
            self.path.parent.mkdir(parents=True, exist_ok=True)
            self.path.touch(exist_ok=False)
        except FileExistsError:
            return False
        except OSError:
            pass  # writing meets the same trouble, and explains it
        write_json(self.path, self.who)
        return True

    def tell(self, facts: dict[str, Any]) -> None:
        """Add facts about the progress of the job."""
        write_json(self.path, self.who | {"since": now(), **facts}, durable=False)

    def refresh(self) -> None:
        """Show now and then that the worker lives.

        Raises:
            ClaimLostError: the job belongs to another worker by now, who took this one for dead.
        """
        if time.monotonic() - self._refreshed < REFRESH_S:
            return
        self._refreshed = time.monotonic()
        try:
            holder = read_json(self.path)
            if holder is None and self.take():
                return
            if not is_same(holder or {}, self.who):
                raise ClaimLostError(f"another worker has taken over {self.path.stem}: {holder}")
            os.utime(self.path)
        except OSError as error:  # a file system that hiccups must not end hours of calculation
            print(f"{now()} the claim on the job could not be refreshed: {error}", flush=True)


def _scheduler_job() -> dict[str, str]:
    number = os.environ.get("SLURM_JOB_ID")
    return {"slurm_job": number} if number else {}


@contextmanager
def claim(layout: Layout, job: str, poll_s: float = 1.0) -> Iterator[Claim]:
    """Hold the claim on a job, so that no two workers ever write the same records.

    A worker that an earlier run left behind on this machine is waited for.  A claim from another
    machine holds as long as its worker refreshes it.
    """
    mine = Claim(layout.worker(job))
    while not mine.take():
        if is_held(mine.path):
            print(f"{job} is still being computed by an earlier worker; waiting for it", flush=True)
            time.sleep(poll_s)
        else:
            _clear_dead(mine.path)
    try:
        yield mine
    finally:
        if is_same(read_json(mine.path) or {}, mine.who):
            mine.path.unlink(missing_ok=True)


def _clear_dead(path: Path) -> None:
    """Remove a dead worker's claim, one process at a time: the next may have put its own there by then."""
    turn = path.with_name(f".{path.name}.clearing")
    try:
        turn.touch(exist_ok=False)
    except FileExistsError:
        if not is_held(turn):  # somebody died in the few lines below
            turn.unlink(missing_ok=True)
        return
    try:
        before = path.stat()
        if not is_held(path) and os.path.samestat(before, path.stat()):
            path.unlink()
    except FileNotFoundError:  # it went by itself
        return
    finally:
        turn.unlink(missing_ok=True)


def is_held(path: Path) -> bool:
    """Whether the worker that a claim's file names is at work."""
    holder = read_json(path)
    if holder is not None and is_local(holder):
        return is_alive(holder)
    try:
        return _is_fresh(path, path.stat().st_mtime)
    except FileNotFoundError:
        return False


_AHEAD: dict[Path, tuple[float, float]] = {}
"""Claims whose time lies ahead of this machine's clock: that time, and when it was first seen (monotonic, s)."""


def _is_fresh(path: Path, refreshed: float) -> bool:
    """Whether a claim was refreshed lately; where clocks do not agree, only watching it tells."""
    age = time.time() - refreshed
    if age >= 0.0:
        return age < STALE_AFTER_S
    if _AHEAD.get(path, (None,))[0] != refreshed:
        _AHEAD[path] = refreshed, time.monotonic()
    return time.monotonic() - _AHEAD[path][1] < STALE_AFTER_S


def live_workers(layout: Layout) -> list[str]:
    """Return the jobs whose workers are at work at present."""
    return sorted(p.stem for p in layout.worker("x").parent.glob("[!.]*.json") if is_held(p))
