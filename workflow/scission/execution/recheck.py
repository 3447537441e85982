"""Before a run goes on: is everything still there that its finished jobs say they have done?

Jobs declare a small summary; records lie beside it, unseen by the engine.  A record that somebody deleted, or that
changed after the summary was written and cannot be read any more, frees its job, which then computes that record
alone.  Names and times tell nearly all; only records that are younger than their summary are opened.
"""

from __future__ import annotations

import hashlib
import os
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from scission.execution.layout import Layout, entries, read_json
from scission.execution.ledger import record_kind
from scission.records.atomic import write_whole
from scission.records.store import DAMAGED, FOLDERS, Store

Place = tuple[str, str]
"""Kind and key of a record."""


def recheck(layout: Layout) -> list[str]:
    """Free the jobs of which a record is gone or damaged, set a damaged campaign.h5 aside; say what was found."""
    found = []
    freed = list(_free_jobs(layout)) if layout.job_done("x").parent.is_dir() else []
    if freed:
        found.append(f"records of {len(freed)} finished jobs are missing or damaged: they are computed again")
    if _set_aside_if_changed(layout.gathered):
        found.append(f"{layout.gathered} is damaged: it is set aside and gathered anew")
    return found


def _free_jobs(layout: Layout) -> Iterator[str]:
    times, store = _written(layout), Store(layout.folder)
    for entry in (read_json(layout.plan / "plan.json") or {}).get("jobs", []):
        job = entry["job"]
        done = _time(layout.job_done(job))
        if done is None:
            continue
        places = places_of(read_json(layout.job_plan(job)) or {})
        if not all(_is_sound(store, place, times.get(place), done) for place in places):
            layout.job_done(job).unlink(missing_ok=True)
            yield job


def _is_sound(store: Store, place: Place, written: int | None, done: int) -> bool:
    if written is None:
        return False
    if written <= done:
        return True
    record = store.read(*place)
    return record is not None and record.reason != "not-finite"


def places_of(payload: dict[str, Any]) -> Iterator[Place]:
    """Give kind and key of every record that a job's plan speaks of."""
    yield from (("reference", key) for key in payload.get("reference_keys", []))
    yield from (("point", item["key"]) for item in payload.get("publish", []))
    yield from ((record_kind(item), item["key"]) for item in payload.get("points", []))


def _written(layout: Layout) -> dict[Place, int]:
    """Return when each record was written, ns."""
    return {
        (kind, name.removesuffix(".npz")): time
        for kind, folder in FOLDERS.items()
        for name, time in _times(layout.folder / folder)
    }


def _times(root: Path) -> Iterator[tuple[str, int]]:
    for group in entries(root, ""):
        yield from ((e.name, e.stat().st_mtime_ns) for e in entries(Path(group.path), ".npz"))


def _time(path: Path) -> int | None:
    try:
        return path.stat().st_mtime_ns
    except FileNotFoundError:
        return None


def seal(path: Path) -> None:
    """Write the SHA-256 of a file beside it, as ``sha256sum -c`` reads it.

    Raises:
        OSError: the file cannot be read, or its folder not be written.
    """
    write_whole(_seal_of(path), f"{_digest(path)}  {path.name}\n".encode())


def unseal(path: Path) -> None:
    """Take the digest away, before the file is written anew."""
    _seal_of(path).unlink(missing_ok=True)


def _seal_of(path: Path) -> Path:
    return path.with_name(f"{path.name}.sha256")


def _digest(path: Path) -> str:
    with path.open("rb") as handle:
        return hashlib.file_digest(handle, "sha256").hexdigest()


def _set_aside_if_changed(path: Path) -> bool:
    seal_file = _seal_of(path)
    if not (path.is_file() and seal_file.is_file()) or seal_file.read_text().split()[:1] == [_digest(path)]:
        return False
    aside = path.parent / DAMAGED / path.name
    aside.parent.mkdir(exist_ok=True)
    os.replace(path, aside)
    unseal(path)
    return True
