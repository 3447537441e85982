"""Commands that fill a results folder: what they say when its disk stands in their way."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from scission.cli.common import FAULT, POINTS_FAILED, WRONG_INPUT, tell


def watch_disk(folder: Path, run: Callable[[], int]) -> int:
    """Run something that fills ``folder``; where the disk stands in its way, say so in one line.

    Raises:
        OSError: the file system refuses something else.
    """
    from scission.execution import engine, storage

    words = storage.trouble(folder)
    if words:
        tell(words)
        return FAULT
    try:
        status = run()
    except OSError as error:
        words = storage.trouble(folder, storage.SCARCE_BYTES)
        if not words:
            raise
        tell(f"{words} ({error})")
        return FAULT
    ended_badly = status not in (0, WRONG_INPUT, POINTS_FAILED, engine.INTERRUPTED)
    if ended_badly and (words := storage.trouble(folder, storage.SCARCE_BYTES)):
        tell(words)
    return status
