"""Files that appear whole or not at all: written beside their place, flushed to disk, then renamed."""

from __future__ import annotations

import os
import secrets
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

TEMPORARY_SUFFIX = ".part"


class UnwritableError(OSError):
    """The file system refuses to take a file: no room, no permission; no statement about what was computed."""


def temporary_beside(path: Path) -> Path:
    """A name in the folder of ``path`` that no other writer, here or on another host, will choose."""
    return path.with_name(f".{path.name}.{os.getpid()}-{secrets.token_hex(6)}{TEMPORARY_SUFFIX}")


def write_whole(path: Path, data: bytes, durable: bool = True) -> None:
    """Put ``data`` at ``path``; whoever reads it sees the old file or the new one, never a mixture.

    Only what means nothing once its process has ended may be other than ``durable``: it is not flushed to the disk,
    so that a machine that loses power may leave an empty file.

    Raises:
        UnwritableError: the folder cannot be written or the disk is full; ``path`` is as it was before.
    """
    with replacing(path, durable) as temporary, temporary.open("xb") as handle:
        handle.write(data)


@contextmanager
def replacing(path: Path, durable: bool = True) -> Iterator[Path]:
    """Give a temporary path to write to; rename it to ``path`` when the block ends well.

    When the block raises, the temporary file is removed and ``path`` stays as it was.

    Raises:
        UnwritableError: with the path and what to look for, when the file system refuses.
    """
    temporary = temporary_beside(path)
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        yield temporary
        if durable:
            _flush(temporary)
        os.replace(temporary, path)
    except OSError as error:
        raise _explained(error, path) from error
    finally:
        with suppress(OSError):
            temporary.unlink()


def _flush(path: Path) -> None:
    # Without this a machine that loses power may keep the new name with no content behind it.
    # The folder is not flushed: losing the rename leaves the old file, which is whole as well.
    descriptor = os.open(path, os.O_RDWR)
    try:
        os.fsync(descriptor)
    finally:
        os.close(descriptor)


def _explained(error: OSError, path: Path) -> UnwritableError:
    what = error.strerror or str(error)
    hint = "what was there before is unchanged; check free space, quota and permissions of the folder"
    return UnwritableError(error.errno, f"cannot write {path}: {what} ({hint})")
