"""From a failure list to requests: which records shall be computed again, and which jobs do that."""

from __future__ import annotations

import hashlib
from collections.abc import Container, Iterator, Sequence
from dataclasses import dataclass, field
from typing import Any, Protocol

from scission.execution.layout import Layout, read_json, write_json
from scission.execution.markers import now
from scission.execution.planning import read_points
from scission.execution.remedies import Factors, checked, factors, next_remedy
from scission.records.store import Record, Store


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
    """One calculation to do again: the kind of its record, the remedy, and the points that led to it."""

    kind: str
    remedy: str
    record: Record | None
    points: set[str] = field(default_factory=set)


def request_points(layout: Layout, rows: Sequence[ListedPoint], remedy: str = "") -> str:
    """Ask for the listed points and free the jobs that compute them; return what was done, in words.

    A request is named after the attempt it follows, so asking twice for the same attempt is one
    request.  ``remedy`` goes before the rows' own; where neither says one, the ladder does.

    Raises:
        ValueError: a row names a point that is not planned or an unknown remedy; nothing was requested.
    """
    planned = {(r["scan"], r["level"], int(r["point"])): r for r in read_points(layout)}
    _check(rows, planned, remedy)
    store = Store(layout.folder)
    wanted: dict[str, _Wanted] = {}
    for row in rows:
        entry = planned[row.scan, row.level, row.point]
        _want(store, wanted, entry["key"], entry["reference_key"], remedy or row.remedy)
    for key, item in wanted.items():
        _request(layout, key, item)
    jobs = _free_jobs(layout, wanted)
    return f"{len(rows)} listed points: {len(wanted)} calculations to do again, in {jobs} jobs"


def _check(rows: Sequence[ListedPoint], planned: Container[tuple[str, str, int]], remedy: str) -> None:
    problems = []
    for row in rows:
        if (row.scan, row.level, row.point) not in planned:
            problems.append(
                f"line {row.line}: {row.scan}, {row.level} has no point {row.point} in this campaign"
            )
        try:
            checked(row.remedy)
        except ValueError as error:
            problems.append(f"line {row.line}: {error}")
    if problems:
        raise ValueError("\n".join(problems))
    checked(remedy)


def _want(store: Store, wanted: dict[str, _Wanted], key: str, reference_key: str, remedy: str) -> None:
    """Decide whether the point itself or its reference has to be computed again, and how."""
    record = store.read("point", key, arrays=False)
    reference = store.read("reference", reference_key, arrays=False)
    of_reference = reference is None or reference.status != "converged"
    if record is not None and record.stage == "reference":  # nothing but its reference
        of_reference = True
    kind, target, latest = ("reference", reference_key, reference) if of_reference else ("point", key, record)
    remedy = remedy or (next_remedy(latest) if latest is not None else "")
    wanted.setdefault(target, _Wanted(kind, remedy, latest)).points.add(key)


def _request(layout: Layout, key: str, item: _Wanted) -> None:
    attempts = item.record.attempts if item.record else 0
    name = hashlib.sha256(f"{key} {attempts}".encode()).hexdigest()[:16]
    write_json(layout.request(key), {"id": name, "remedy": item.remedy, "requested": now()})


def _free_jobs(layout: Layout, wanted: dict[str, _Wanted]) -> int:
    """Remove the summaries of the jobs concerned, so that the engine runs them, and note their grants."""
    index = read_json(layout.plan / "plan.json") or {}
    touched = set(wanted).union(*(item.points for item in wanted.values()))
    grants: dict[str, Factors] = {}
    for entry in index.get("jobs", []):
        keys = touched & set(_keys_of(read_json(layout.job_plan(entry["job"])) or {}))
        if keys:
            more = [factors(wanted[k].remedy, wanted[k].record) for k in keys if k in wanted]
            grants[entry["job"]] = Factors(*(max([1.0, *(m[i] for m in more)]) for i in (0, 1)))
            layout.job_done(entry["job"]).unlink(missing_ok=True)
    write_json(layout.grants, {job: list(grant) for job, grant in grants.items()})
    return len(grants)


def _keys_of(payload: dict[str, Any]) -> Iterator[str]:
    yield from payload.get("reference_keys", [])
    for item in [*payload.get("points", []), *payload.get("publish", [])]:
        yield item["key"]
