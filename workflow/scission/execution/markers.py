"""Small files beside the records: who computes what at present, and what shall be computed again."""

from __future__ import annotations

import contextlib
import time
from collections.abc import Iterator
from contextlib import contextmanager
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from scission.execution.layout import Layout, read_json, write_json
from scission.execution.processes import identity, is_alive, is_local


def now() -> str:
    """Return the time as UTC, ISO 8601, to the millisecond."""
    return datetime.now(UTC).isoformat(timespec="milliseconds").replace("+00:00", "Z")


def earlier_starts(layout: Layout, key: str) -> int:
    """Return how many starts a left-over marker counts: those that ended without a record."""
    marker = read_json(layout.running(key))
    return int(marker.get("attempt", 0)) if marker else 0


def mark_running(layout: Layout, key: str, attempt: int, job: str) -> None:
    """Say that the calculation of ``key`` is being started for the ``attempt``-th time."""
    write_json(layout.running(key), {"attempt": attempt, "job": job, "started": now(), **identity()})


def clear_running(layout: Layout, key: str) -> None:
    """Take the marker away; only after the record is in its place."""
    layout.running(key).unlink(missing_ok=True)


def pending_request(layout: Layout, key: str) -> dict[str, Any] | None:
    """Return the request to compute ``key`` again, if there is one."""
    return read_json(layout.request(key))


@contextmanager
def claim(layout: Layout, job: str, poll_s: float = 1.0) -> Iterator[Path]:
    """Hold the claim on a job, so that no two workers ever write the same records.

    A worker that an earlier run left behind on this machine is waited for.  A claim from another
    machine holds as long as its worker refreshes it.
    """
    path = layout.worker(job)
    while _held(path):
        print(f"{job} is still being computed by an earlier worker; waiting for it", flush=True)
        time.sleep(poll_s)
    write_json(path, identity() | {"since": now()})
    try:
        yield path
    finally:
        path.unlink(missing_ok=True)


STALE_AFTER_S = 120.0
"""A claim from another machine that was not refreshed for so long is taken for dead."""


def _held(path: Path) -> bool:
    holder = read_json(path)
    if holder is None:
        return False
    if is_local(holder):
        return is_alive(holder)
    with contextlib.suppress(FileNotFoundError):
        return time.time() - path.stat().st_mtime < STALE_AFTER_S
    return False


def live_workers(layout: Layout) -> list[str]:
    """Return the jobs whose workers are at work at present."""
    return sorted(p.stem for p in layout.worker("x").parent.glob("[!.]*.json") if _held(p))
