"""One run of a campaign at a time, and going on after a run that was killed.

The run holds a lock on run.json for as long as it lives; the system drops it however the run ends.
What run.json says tells the next run whether an engine or workers were left behind.
"""

from __future__ import annotations

import fcntl
import json
import os
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any, TextIO

from scission.execution.layout import Layout
from scission.execution.markers import live_workers, now
from scission.execution.processes import identity, is_alive, is_local

HEARTBEAT_S = 10.0
STALE_AFTER_S = 90.0
"""A run on another machine that gave no sign of life for so long is taken for dead."""


class AlreadyRunningError(Exception):
    """Somebody else runs this campaign at present; the message says who."""


class RunFile:
    """The run file of a campaign, locked by this process."""

    def __init__(self, handle: TextIO, left: dict[str, Any]) -> None:
        self._handle = handle
        self._content = identity() | {"since": now()}
        self._beat = 0.0
        self.left = left
        """What an earlier run that did not end properly had written, {} if there was none."""

    def note(self, **facts: Any) -> None:
        """Add facts (such as who the engine is) for a run that may have to clean up after this one."""
        self._content |= facts
        self._write(self._content)

    def beat(self) -> None:
        """Give a sign of life now and then, for machines that do not see this process."""
        if time.monotonic() - self._beat > HEARTBEAT_S:
            os.utime(self._handle.fileno())
            self._beat = time.monotonic()

    def clear(self) -> None:
        """Say that the run has ended properly."""
        self._write({})

    def _write(self, content: dict[str, Any]) -> None:
        # In place, not renamed: the lock belongs to this very file.
        self._handle.seek(0)
        self._handle.truncate()
        json.dump(content, self._handle)
        self._handle.flush()


@contextmanager
def hold(layout: Layout) -> Iterator[RunFile]:
    """Hold the run of a campaign.

    Raises:
        AlreadyRunningError: another process runs it, here or on another machine.
    """
    layout.folder.mkdir(parents=True, exist_ok=True)
    with os.fdopen(os.open(layout.run_file, os.O_RDWR | os.O_CREAT, 0o644), "r+", encoding="utf-8") as handle:
        left = _content(handle)
        try:
            fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except BlockingIOError:
            raise AlreadyRunningError(_who(layout.folder.name, left)) from None
        left = _content(handle)
        age = time.time() - layout.run_file.stat().st_mtime
        if left and not is_local(left) and age < STALE_AFTER_S:
            raise AlreadyRunningError(_who(layout.folder.name, left))
        run = RunFile(handle, left)
        run.note()
        yield run
        run.clear()


def _content(handle: TextIO) -> dict[str, Any]:
    handle.seek(0)
    try:
        data = json.loads(handle.read() or "{}")
    except ValueError:  # killed in mid-writing
        return {}
    return data if isinstance(data, dict) else {}


def _who(campaign: str, left: dict[str, Any]) -> str:
    who = f"process {left.get('pid', '?')} on {left.get('host', '?')} since {left.get('since', '?')}"
    return f"campaign {campaign!r} is being run already, by {who}; `scission status` shows how far it is"


def settle_earlier_run(
    layout: Layout, left: dict[str, Any], tell: Callable[[str], None], tick: Callable[[], None] = lambda: None
) -> None:
    """Wait until nothing of an earlier, killed run is at work any more, then free the engine's lock.

    What its jobs compute meanwhile is kept, so nothing is lost and nothing computed twice.
    """
    engine = left.get("engine") or {}
    if engine and is_alive(engine):
        tell(
            f"an earlier run was killed, its engine (process {engine['pid']}) is still at work: following it"
        )
        _wait_while(lambda: is_alive(engine), tick)
    jobs = live_workers(layout)
    if jobs:
        tell(f"an earlier run was killed; waiting for what it left at work: {', '.join(jobs)}")
        _wait_while(lambda: bool(live_workers(layout)), tick)
    _unlock(layout.folder / ".snakemake" / "locks")


def _wait_while(condition: Callable[[], bool], tick: Callable[[], None], poll_s: float = 0.5) -> None:
    while condition():
        tick()
        time.sleep(poll_s)


def _unlock(locks: Path) -> None:
    """Remove the engine's lock files: the run's own lock says that no engine is at work here."""
    if locks.is_dir():
        for path in locks.iterdir():
            path.unlink()
