"""From a failure list to requests: which records shall be computed again, and which jobs do that."""

from __future__ import annotations

import hashlib
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from typing import Protocol

from scission.execution.layout import Layout, read_json, write_json
from scission.execution.markers import now
from scission.execution.planning import read_points
from scission.records.store import Store


class ListedPoint(Protocol):
    """What is asked of a row of a failure list."""

    @property
    def line(self) -> int: ...
    @property
    def scan(self) -> str: ...
    @property
    def level(self) -> str: ...
    @property
    def point(self) -> int: ...
    @property
    def remedy(self) -> str: ...


@dataclass
class _Wanted:
    """Keys to compute again, with the remedy for each, and the kind of their records."""

    kinds: dict[str, str] = field(default_factory=dict)
    remedies: dict[str, str] = field(default_factory=dict)
    touched: set[str] = field(default_factory=set)


def request_points(layout: Layout, rows: Sequence[ListedPoint], remedy: str = "") -> str:
    """Ask for the listed points and free the jobs that compute them; return what was done, in words.

    A request is named after the attempt it follows, so asking twice for the same attempt is one
    request.  ``remedy`` goes before the rows' own.

    Raises:
        ValueError: a row names a point that is not planned; nothing was requested.
    """
    planned = {(r["scan"], r["level"], int(r["point"])): r for r in read_points(layout)}
    strange = [row for row in rows if (row.scan, row.level, row.point) not in planned]
    if strange:
        raise ValueError(
            "\n".join(f"line {r.line}: {r.scan}, {r.level} has no point {r.point}" for r in strange)
        )
    wanted, store = _Wanted(), Store(layout.folder)
    for row in rows:
        entry = planned[row.scan, row.level, row.point]
        _want(store, wanted, entry["key"], entry["reference_key"], remedy or row.remedy)
    for key, kind in wanted.kinds.items():
        _request(layout, store, kind, key, wanted.remedies[key])
    jobs = _free_jobs(layout, wanted.touched | wanted.kinds.keys())
    return f"{len(rows)} listed points: {len(wanted.kinds)} calculations to do again, in {jobs} jobs"


def _want(store: Store, wanted: _Wanted, key: str, reference_key: str, remedy: str) -> None:
    """Decide whether the point itself or its reference has to be computed again."""
    record = store.read("point", key, arrays=False)
    reference = store.read("reference", reference_key, arrays=False)
    of_reference = reference is None or reference.status != "converged"
    if record is not None and record.stage == "reference":  # nothing but its reference
        of_reference = True
    target, kind = (reference_key, "reference") if of_reference else (key, "point")
    wanted.kinds[target] = kind
    wanted.remedies[target] = remedy or wanted.remedies.get(target, "")
    wanted.touched.add(key)


def _request(layout: Layout, store: Store, kind: str, key: str, remedy: str) -> None:
    record = store.read(kind, key, arrays=False)
    attempts = record.attempts if record else 0
    name = hashlib.sha256(f"{key} {attempts}".encode()).hexdigest()[:16]
    write_json(layout.request(key), {"id": name, "remedy": remedy, "requested": now()})


def _free_jobs(layout: Layout, keys: set[str]) -> int:
    """Remove the summaries of the jobs that make any of ``keys``, so that the engine runs them."""
    index = read_json(layout.plan / "plan.json") or {}
    n = 0
    for entry in index.get("jobs", []):
        if keys & set(_keys_of(read_json(layout.job_plan(entry["job"])) or {})):
            layout.job_done(entry["job"]).unlink(missing_ok=True)
            n += 1
    return n


def _keys_of(payload: dict[str, list[dict[str, str]]]) -> Iterable[str]:
    yield from payload.get("reference_keys", [])  # type: ignore[misc]
    for item in [*payload.get("points", []), *payload.get("publish", [])]:
        yield item["key"]
