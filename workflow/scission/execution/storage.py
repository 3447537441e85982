"""Whether a results folder can take files, in words for a person."""

from __future__ import annotations

import errno
import os
import secrets
import shutil
import sys
from collections.abc import Callable
from contextlib import suppress
from pathlib import Path

from scission.execution.processes import MEGABYTE
from scission.records.atomic import UnwritableError

PROBE_BYTES = 1 << 16
"""What must fit before anything is started."""
SCARCE_BYTES = 1 << 24
"""What must fit after a run that failed, for its failure not to be put down to the disk."""

CANNOT_WRITE = 74
"""Exit status of a job, as sysexits.h has it for trouble with input and output."""

_FULL = (errno.ENOSPC, errno.EDQUOT)
_CLOSED = (errno.EROFS, errno.EACCES, errno.EPERM)
_AGAIN = "then start the same command again; what is done is kept"


def trouble(folder: Path, n_bytes: int = PROBE_BYTES) -> str:
    """Return why ``n_bytes`` cannot be written below ``folder``, and what to do; "" if they can.

    It tries, in the nearest folder that exists: quotas and mounts tell nobody beforehand.
    """
    home = next((place for place in (folder, *folder.parents) if place.is_dir()), folder)
    probe = home / f".probe-{os.getpid()}-{secrets.token_hex(4)}"
    try:
        with probe.open("xb") as handle:
            handle.write(bytes(n_bytes))
    except OSError as error:
        return explain(folder, error)
    finally:
        with suppress(OSError):
            probe.unlink()
    return ""


def explain(folder: Path, error: OSError) -> str:
    """Return an error of the file system in one line that names the folder and the remedy."""
    if error.errno in _FULL:
        return f"{folder}: the disk is full ({_free(folder)}); make room or have the quota raised, {_AGAIN}"
    if error.errno in _CLOSED:
        words = "read-only file system" if error.errno == errno.EROFS else "no permission"
        return f"{folder} cannot be written ({words}); make it writable or name another --results folder, {_AGAIN}"
    return f"{folder} cannot be written ({error.strerror or error}); see to its disk, {_AGAIN}"


def told_plainly(work: Callable[[], int | None]) -> int:
    """Do some work; return its exit status, or where the disk takes nothing, say so in a line and CANNOT_WRITE."""
    try:
        return work() or 0
    except UnwritableError as error:
        print(error.strerror, file=sys.stderr)
        return CANNOT_WRITE


def _free(folder: Path) -> str:
    with suppress(OSError):
        return f"{shutil.disk_usage(folder).free / MEGABYTE:.1f} MB free there"
    return "no room left"
