"""One file per calculation, written whole or not at all, found by its key.

Readers and writers need no lock: a record appears under its final name in one step, and every
writer uses a temporary name of its own, so that two writers of the same key leave one whole record.
"""

from __future__ import annotations

import logging
import os
import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import numpy as np

from scission.records.atomic import temporary_beside, write_whole
from scission.records.fileformat import DamagedRecordError, pack, unpack
from scission.records.schema import SCHEMA_VERSION
from scission.records.validate import finite_or_none, lacks_a_number, one_line, problems, settled

FOLDERS = {"point": "records", "reference": "references", "fragment": "fragments"}
DAMAGED = "damaged"

_KEY = re.compile(r"[0-9A-Za-z][0-9A-Za-z_-]{1,119}")
_log = logging.getLogger(__name__)


@dataclass
class Record:
    """Everything kept of one calculation; names and units of the numbers are in ``records.schema``.

    Attributes:
        key: identity; the file is named after it.
        kind: ``point``, ``reference`` or ``fragment``.
        status: one of ``schema.STATUSES``.
        reason: key of ``schema.REASONS``.
        message: one line for a person, ASCII.
        stage: ``reference``, ``correlate`` or ``fragment``.
        attempts: how often the calculation was started.
        remedy: remedy used in the last attempt, "" if none.
        scalars: numbers by the names of ``schema.SCALARS``.
        diagnostics: evaluated diagnostics by name.
        absent: diagnostic to the reason why it is not meaningful here.
        notes: remarks in words, by subject.
        inputs: what was computed (symbols, charge, multiplicity, level ...), readable.
        reference_key: key of the reference record it was computed from.
        reference_stamp: ``stamp`` of that record at the time.
        stamp: changes when the numbers change.
        history: earlier attempts, oldest first.
        provenance: versions, host, times (UTC, ISO 8601).
        arrays: arrays by the names of ``schema.ARRAYS``.
    """

    key: str
    kind: str
    status: str
    reason: str = ""
    message: str = ""
    stage: str = ""
    attempts: int = 1
    remedy: str = ""
    scalars: dict[str, float | int] = field(default_factory=dict)
    diagnostics: dict[str, float] = field(default_factory=dict)
    absent: dict[str, str] = field(default_factory=dict)
    notes: dict[str, str] = field(default_factory=dict)
    inputs: dict[str, Any] = field(default_factory=dict)
    reference_key: str = ""
    reference_stamp: str = ""
    stamp: str = ""
    history: list[dict[str, Any]] = field(default_factory=list)
    provenance: dict[str, Any] = field(default_factory=dict)
    arrays: dict[str, np.ndarray] = field(default_factory=dict)


_HEAD_TYPES = {name: type(value) for name, value in vars(Record("", "", "")).items() if name != "arrays"}


class Store:
    """The records of one campaign below ``folder`` (results/<campaign>)."""

    def __init__(self, folder: Path | str) -> None:
        self.folder = Path(folder)

    def path(self, kind: str, key: str) -> Path:
        """Where the record lies, whether it exists or not.

        Raises:
            ValueError: an unknown kind, or a key that is not safe as a file name.
        """
        if kind not in FOLDERS:
            raise ValueError(f"record kind {kind!r} is not one of {', '.join(FOLDERS)}")
        if not _KEY.fullmatch(key):
            raise ValueError(f"record key {key!r} must be 2 to 120 letters, digits, '-' or '_'")
        return self.folder / FOLDERS[kind] / key[:2] / f"{key}.npz"

    def aside(self, kind: str, key: str) -> Path:
        """Where a damaged file of that record is kept for inspection."""
        path = self.path(kind, key)
        return self.folder / DAMAGED / f"{FOLDERS[kind]}-{path.name}"

    def read(self, kind: str, key: str, arrays: bool | tuple[str, ...] = True) -> Record | None:
        """The record, or None if there is none or it was damaged (then it was set aside).

        A record that calls a number converged which is none is given as failed, whoever wrote it.

        Args:
            arrays: all of them, none, or only those named; what is read is checked by checksum.

        Raises:
            OSError: the file is there but the file system does not give it out.
        """
        path = self.path(kind, key)
        try:
            with path.open("rb") as handle:
                try:
                    return _record(*unpack(handle, arrays), kind=kind, key=key)
                except DamagedRecordError as damage:
                    self._set_aside(path, self.aside(kind, key), os.fstat(handle.fileno()), str(damage))
        except FileNotFoundError:
            pass
        return None

    def write(self, record: Record) -> Path:
        """Put the record in its place, replacing an earlier one in one step.

        Raises:
            ValueError: a field that the schema does not know, a wrong shape, or a converged record
                with a number that is not finite (``validate.settled`` turns that into a failure).
            OSError: the folder cannot be written or the disk is full; an earlier record is intact.
        """
        path = self.path(record.kind, record.key)
        found = problems(record)
        if found:
            raise ValueError(f"record {record.key}: " + "; ".join(found))
        write_whole(path, pack(_head(record), record.arrays))
        return path

    def keys(self, kind: str) -> set[str]:
        """Keys of all records of that kind, from the file names alone."""
        root = self.path(kind, "00").parents[1]
        return {name.removesuffix(".npz") for name in _file_names(root) if name.endswith(".npz")}

    def _set_aside(self, path: Path, aside: Path, seen: os.stat_result, what: str) -> None:
        _log.warning("%s is damaged (%s); it will be computed again", path, what)
        try:
            now = path.stat()
            if (now.st_ino, now.st_mtime_ns) != (seen.st_ino, seen.st_mtime_ns):
                return  # somebody has put a new record there in the meantime
            aside.parent.mkdir(exist_ok=True)
            os.replace(path, aside if not aside.exists() else temporary_beside(aside).with_suffix(".npz"))
            with (aside.parent / "log.txt").open("a", encoding="utf-8") as log:
                log.write(f"{datetime.now(UTC):%Y-%m-%dT%H:%M:%SZ} {path.name} {one_line(what)}\n")
        except FileNotFoundError:
            return  # somebody else has set it aside
        except OSError as error:
            _log.warning("%s could not be moved to %s: %s", path, aside.parent, error)


def _head(record: Record) -> dict[str, Any]:
    head = {name: getattr(record, name) for name in _HEAD_TYPES}
    head["message"] = one_line(record.message)
    for name in ("scalars", "diagnostics"):
        head[name] = {key: finite_or_none(value) for key, value in head[name].items()}
    return {"record": SCHEMA_VERSION} | head


def _record(head: dict[str, Any], arrays: dict[str, np.ndarray], kind: str, key: str) -> Record:
    if (head.get("kind"), head.get("key")) != (kind, key):
        raise DamagedRecordError(f"the file holds {head.get('kind')} {head.get('key')}")
    if head.get("record") != SCHEMA_VERSION:
        raise ValueError(
            f"record {key} has layout version {head.get('record')}, this program reads {SCHEMA_VERSION}: "
            "use the version of the program that wrote it, or another results folder"
        )
    wrong = [name for name, kind_of in _HEAD_TYPES.items() if not isinstance(head.get(name), kind_of)]
    if wrong:
        raise DamagedRecordError(f"the file lacks or misstates {', '.join(wrong)}")
    for name in ("scalars", "diagnostics"):
        head[name] = {item: np.nan if value is None else value for item, value in head[name].items()}
    record = Record(**{name: head[name] for name in _HEAD_TYPES}, arrays=arrays)
    return settled(record) if lacks_a_number(record) else record


def _file_names(root: Path) -> Iterator[str]:
    try:
        groups = list(os.scandir(root))
    except FileNotFoundError:
        return
    for group in groups:
        if group.is_dir():
            yield from (entry.name for entry in os.scandir(group.path) if not entry.name.startswith("."))
