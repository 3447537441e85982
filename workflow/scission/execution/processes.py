"""Processes: who they are, whether they live, how much memory they hold, how to end them."""

from __future__ import annotations

import ctypes
import os
import signal
import socket
import sys
import time
from contextlib import suppress
from functools import cache
from pathlib import Path
from typing import Any

import psutil

MEGABYTE = 1.0e6
_START_TOLERANCE_S = 1.0
_PR_SET_PDEATHSIG = 1


def identity(pid: int | None = None) -> dict[str, Any]:
    """Return what identifies a process for good: host, start of the system, number and start time (s).

    Where the system tells, the start time counts from the start of the system: a clock that is set anew must not make
    a process look like another.
    """
    process = psutil.Process(pid)
    return {"host": socket.gethostname(), "boot": _boot(), "pid": process.pid, "born": _born(process)}


@cache
def _boot() -> str:
    """Return what identifies the time since the system was started, "" where nothing does."""
    with suppress(OSError):
        return Path("/proc/sys/kernel/random/boot_id").read_text(encoding="ascii").strip()
    return ""


def _born(process: psutil.Process) -> float:
    """Return when a process started, s since the system did on Linux, since 1970 elsewhere."""
    try:
        stat = Path(f"/proc/{process.pid}/stat").read_bytes()
    except FileNotFoundError:
        return float(process.create_time())
    return int(stat.rpartition(b")")[2].split()[19]) / os.sysconf("SC_CLK_TCK")  # field 22 of proc(5)


def is_local(who: dict[str, Any]) -> bool:
    """Whether ``who`` (see :func:`identity`) ran on this machine."""
    return who.get("host") == socket.gethostname()


def is_same(one: dict[str, Any], other: dict[str, Any]) -> bool:
    """Whether both name the same process (see :func:`identity`)."""
    return bool(one) and all(one.get(name) == other.get(name) for name in ("host", "pid", "born"))


def is_alive(who: dict[str, Any]) -> bool:
    """Whether exactly that process still runs here; a number that was given out again does not count."""
    if not is_local(who):
        return False
    try:
        process = psutil.Process(int(who["pid"]))
        same = abs(_born(process) - float(who["born"])) < _START_TOLERANCE_S and who.get("boot") == _boot()
        return same and process.status() != psutil.STATUS_ZOMBIE
    except (psutil.Error, KeyError, TypeError, ValueError):
        return False


def resident_mb(pid: int) -> float:
    """Return the resident memory of a process and all below it, MB (10^6 bytes); 0 when it is gone."""
    total = 0
    try:
        process = psutil.Process(pid)
        for member in [process, *process.children(recursive=True)]:
            with suppress(psutil.Error):
                total += member.memory_info().rss
    except psutil.Error:
        return 0.0
    return total / MEGABYTE


def kill_group(pid: int) -> None:
    """End a process that leads its own group, and all of the group, at once."""
    with suppress(ProcessLookupError, PermissionError):
        os.killpg(pid, signal.SIGKILL)


def die_with_parent(parent: int) -> None:
    """Ask the system to kill this process when its parent ends, however it ends (Linux only).

    Elsewhere a closed pipe has to tell; see ``child``.
    """
    if sys.platform.startswith("linux"):
        ctypes.CDLL(None, use_errno=True).prctl(_PR_SET_PDEATHSIG, signal.SIGKILL, 0, 0, 0)
        if os.getppid() != parent:  # it ended before the request was made
            os.kill(os.getpid(), signal.SIGKILL)


def wait_until_gone(who: dict[str, Any], poll_s: float = 0.5, timeout_s: float = float("inf")) -> bool:
    """Wait for a process of this machine to end; False if it still runs after ``timeout_s``."""
    deadline = time.monotonic() + timeout_s
    while is_alive(who):
        if time.monotonic() > deadline:
            return False
        time.sleep(poll_s)
    return True
