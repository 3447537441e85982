"""One run of a campaign at a time, on this machine or any other that shares its files.

The run holds a lock on run.json for as long as it lives; the system drops it however the run ends.
Where file systems do not carry locks from machine to machine, the file's times are the sign of life.
What run.json says tells the next run what may have been left behind (see ``orphans``).
"""

from __future__ import annotations

import errno
import fcntl
import hashlib
import json
import os
import re
import threading
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any, TextIO

from scission.execution.layout import Layout
from scission.execution.markers import now
from scission.execution.processes import identity, is_alive, is_local, is_same

HEARTBEAT_S = 10.0
STALE_AFTER_S = 90.0
"""A run on another machine that gave no sign of life for so long is taken for dead.

Network file systems may show a change after as much as a minute.
"""
_SURELY_DEAD_S = 3600.0
CONFIRM_S = 3.0
_NO_LOCKS = (errno.ENOLCK, errno.ENOSYS, errno.EOPNOTSUPP)


class AlreadyRunningError(Exception):
    """Somebody else runs this campaign at present; the message says who."""


class RunFile:
    """The run file of a campaign, held by this process."""

    def __init__(self, layout: Layout, handle: TextIO, left: dict[str, Any]) -> None:
        self._path = layout.run_file
        self._handle = handle
        self._who = identity()
        carried = {name: left[name] for name in ("engine", "queue") if name in left}
        self._content = self._who | {"since": now()} | carried
        self._closing: dict[str, Any] | None = None
        self.left = left
        """What the latest run left in the file; it holds a ``pid`` if that run did not end properly."""
        self.lost = False
        """Whether another machine took this run for dead and runs the campaign now."""

    def queue_name(self, layout: Layout) -> str:
        """Return how the names of this campaign's jobs in a scheduler's queue begin.

        It stays the same from run to run, so that each finds what earlier ones left; results that
        were copied elsewhere get another one.
        """
        earlier = self.left.get("queue") or {}
        folder = Path(earlier.get("folder", ""))
        if earlier.get("name") and (not folder.exists() or folder.samefile(layout.folder)):
            return str(earlier["name"])
        digest = hashlib.sha256(str(layout.folder.resolve()).encode()).hexdigest()
        return f"scission-{re.sub('[^A-Za-z0-9-]', '-', layout.folder.name)[:24]}-{digest[:10]}"

    def note(self, **facts: Any) -> None:
        """Add facts (such as who the engine is) for a run that may have to clean up after this one."""
        self._content |= facts
        self._write(self._content)

    def put_back(self) -> None:
        """Leave the file at the end as it was found: this run dealt with nothing that was left."""
        self._closing = self.left

    def beat(self) -> None:
        """Give a sign of life, for machines that do not see this process; notice whether one took over."""
        try:
            self.lost = not self.is_mine()
            if not self.lost:
                os.utime(self._handle.fileno())
        except OSError:  # a network disk that is away for a while; whoever takes over will be noticed
            return

    def is_mine(self) -> bool:
        """Whether the file still says that this process runs the campaign."""
        with self._path.open(encoding="utf-8") as fresh:  # opened anew: network disks look for changes then
            found = _content(fresh)
        return "pid" not in found or is_same(found, self._who)

    def clear(self) -> None:
        """Say that the run has ended properly."""
        if not self.lost:
            queue = {name: self._content[name] for name in ("queue",) if self._content.get(name)}
            self._write(queue if self._closing is None else self._closing)

    def _write(self, content: dict[str, Any]) -> None:
        # In place, not renamed: the lock belongs to this very file.  Cut after writing, so that a kill
        # between the two leaves the new content with some of the old behind it, which reading skips.
        self._handle.seek(0)
        self._handle.write(json.dumps(content) + "\n")
        self._handle.flush()
        self._handle.truncate()


@contextmanager
def hold(
    layout: Layout, tell: Callable[[str], None] = lambda _: None, confirm_s: float = 0.0
) -> Iterator[RunFile]:
    """Hold the run of a campaign.

    Args:
        tell: is given a line for a person when this takes long.
        confirm_s: look again after so many seconds whether somebody else started at the same moment, for
            file systems without locks.

    Raises:
        AlreadyRunningError: another process runs it, here or on another machine.
        PermissionError: the results belong to somebody else.
    """
    layout.folder.mkdir(parents=True, exist_ok=True)
    with os.fdopen(os.open(layout.run_file, os.O_RDWR | os.O_CREAT, 0o666), "r+", encoding="utf-8") as handle:
        _lock(handle, layout)
        left = _content(handle)
        if not is_local(left):
            _watch(layout, left, tell)
        elif is_alive(left) and left["pid"] != os.getpid():
            raise AlreadyRunningError(_who(layout.folder.name, left))
        run = RunFile(layout, handle, left)
        run.note()
        time.sleep(confirm_s)
        if not run.is_mine():
            raise AlreadyRunningError(_who(layout.folder.name, _content(handle)))
        with _heartbeat(run):
            yield run
        run.clear()


def _lock(handle: TextIO, layout: Layout) -> None:
    try:
        fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except BlockingIOError:
        raise AlreadyRunningError(_who(layout.folder.name, _content(handle))) from None
    except OSError as error:
        if error.errno not in _NO_LOCKS:
            raise


def _watch(layout: Layout, left: dict[str, Any], tell: Callable[[str], None]) -> None:
    """Look for a sign of life of a run on another machine.

    Only changes count, since the clocks of two machines may differ.
    """
    seen = layout.run_file.stat().st_mtime_ns
    if "pid" not in left or time.time() - seen / 1e9 > _SURELY_DEAD_S:
        return
    tell(
        f"process {left['pid']} on {left.get('host', '?')} did not end its run of this campaign properly: "
        f"watching up to {STALE_AFTER_S:.0f} s for signs of life"
    )
    deadline = time.monotonic() + STALE_AFTER_S
    while time.monotonic() < deadline:
        if layout.run_file.stat().st_mtime_ns != seen:
            raise AlreadyRunningError(_who(layout.folder.name, left))
        time.sleep(min(1.0, STALE_AFTER_S / 10))


@contextmanager
def _heartbeat(run: RunFile) -> Iterator[None]:
    """Give signs of life from a thread, whatever the run is busy with."""
    ended = threading.Event()

    def beat() -> None:
        while not ended.wait(HEARTBEAT_S):
            run.beat()

    thread = threading.Thread(target=beat, daemon=True)
    thread.start()
    try:
        yield
    finally:
        ended.set()
        thread.join()


def _content(handle: TextIO) -> dict[str, Any]:
    handle.seek(0)
    try:
        data = json.JSONDecoder().raw_decode(handle.read() or "{}")[0]
    except ValueError:  # cut short by a full disk
        return {}
    return data if isinstance(data, dict) else {}


def _who(campaign: str, left: dict[str, Any]) -> str:
    who = f"process {left.get('pid', '?')} on {left.get('host', '?')} since {left.get('since', '?')}"
    return f"campaign {campaign!r} is being run already, by {who}; `scission status` shows how far it is"
