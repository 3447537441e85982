"""The state of a campaign at one moment, from names of records and the small files of jobs; reads only.

No record is opened and nothing is locked, so it may be taken from any shell at any time.
"""

from __future__ import annotations

import csv
import heapq
import json
import os
import time
from collections import defaultdict
from collections.abc import Collection, Container, Iterable, Iterator
from dataclasses import dataclass, field
from datetime import datetime
from itertools import chain
from operator import itemgetter
from pathlib import Path

from scission.execution.layout import Layout, entries, read_json
from scission.execution.markers import live_workers

WINDOW_S = 900.0
"""Throughput is that of the last so many seconds."""

MOST_SLOW = 5
"""How many finished calculations that took longest are told."""

_SAMPLED = 2000
"""Times of records are looked up for about so many; keys are digests, so folders are fair samples."""


@dataclass
class Count:
    """Points of one scan and level: planned, with a good record, at work, without a good result."""

    total: int = 0
    good: int = 0
    running: int = 0
    failed: int = 0

    @property
    def left(self) -> int:
        """Points that have no record and are not at work."""
        return self.total - self.good - self.failed - self.running

    def add(self, other: Count) -> None:
        """Add the numbers of another count."""
        self.total += other.total
        self.good += other.good
        self.running += other.running
        self.failed += other.failed


@dataclass(frozen=True)
class AtWork:
    """One calculation: what it is, and for how many seconds it has been at work, or took."""

    what: str
    seconds: float


@dataclass(frozen=True)
class Snapshot:
    """Counts by (scan, level), of the references, jobs and calculations at work, records a second.

    ``slowest`` are the finished calculations that took longest, as far as jobs have told.
    """

    groups: dict[tuple[str, str], Count]
    references: Count
    jobs: list[str]
    at_work: list[AtWork]
    per_second: float
    slowest: list[AtWork]

    @property
    def total(self) -> Count:
        """All points together."""
        total = Count()
        for count in self.groups.values():
            total.add(count)
        return total

    @property
    def seconds_left(self) -> float | None:
        """Time left at the present pace; None while that cannot be told."""
        left = sum(c.left + c.running for c in (self.total, self.references))
        return left / self.per_second if left and self.per_second and self.jobs else None


@dataclass
class Planned:
    """Points of one scan and level, in the order of the plan: numbers, keys, keys of their references."""

    numbers: list[str] = field(default_factory=list)
    keys: list[str] = field(default_factory=list)
    references: list[str] = field(default_factory=list)


@dataclass(frozen=True)
class Told:
    """What the file of a job says: keys without a good result, and those that took longest (s)."""

    bad: frozenset[str] = frozenset()
    slowest: tuple[tuple[str, float], ...] = ()


Plan = dict[tuple[str, str], Planned]


@dataclass
class Watcher:
    """Takes snapshots of one campaign; files that did not change are not read again."""

    layout: Layout
    _planned: tuple[int, Plan] = (0, {})
    _told: dict[str, tuple[int, Told]] = field(default_factory=dict)

    def look(self) -> Snapshot:
        """Return the present state.

        Raises:
            FileNotFoundError: the campaign has no plan yet.
        """
        plan, told = self._plan(), list(self._summaries())
        bad = set[str]().union(*(summary.bad for summary in told))
        points, references = (_keys(self.layout.folder / name) for name in ("records", "references"))
        jobs = live_workers(self.layout)
        markers = dict(_markers(self.layout, set(jobs)))
        groups = {group: _count(planned.keys, points, bad, markers) for group, planned in plan.items()}
        built_on = {key for planned in plan.values() for key in planned.references}
        count = _count(built_on, references, bad, markers)
        slowest = dict(
            heapq.nlargest(MOST_SLOW, chain.from_iterable(s.slowest for s in told), key=itemgetter(1))
        )
        named, pace = _named(plan, {**slowest, **markers}), _pace(self.layout.folder)
        at_work, took = (_longest(seconds, named) for seconds in (markers, slowest))
        return Snapshot(groups, count, jobs, at_work, pace, took)

    def _plan(self) -> Plan:
        path = self.layout.plan / "points.csv"
        changed = path.stat().st_mtime_ns
        if self._planned[0] != changed:
            with path.open(encoding="utf-8", newline="") as handle:
                self._planned = changed, _read_plan(handle)
        return self._planned[1]

    def _summaries(self) -> Iterator[Told]:
        """Give what jobs, finished and at work, have told."""
        for folder in (self.layout.job_done("x").parent, self.layout.worker("x").parent):
            for entry in entries(folder, ".json"):
                yield self._told_by(entry)

    def _told_by(self, entry: os.DirEntry[str]) -> Told:
        try:
            changed = entry.stat().st_mtime_ns
            kept = self._told.get(entry.path)
            if kept is None or kept[0] != changed:
                with open(entry.path, "rb", buffering=0) as handle:  # half the time of pathlib for 10^4 files
                    kept = self._told[entry.path] = changed, _told_in(handle.read())
        except FileNotFoundError:  # a worker that has just ended
            return Told()
        return kept[1]


def _told_in(text: bytes) -> Told:
    try:
        content = json.loads(text)
        slowest = [(str(key), float(seconds)) for key, seconds in content.get("slowest", ())]
        return Told(frozenset(content.get("not_good", ())), tuple(slowest))
    except (ValueError, KeyError, TypeError, AttributeError):  # not a job's file; the counts then lack it
        return Told()


def _read_plan(handle: Iterable[str]) -> Plan:
    rows = csv.reader(handle)
    header = next(rows)
    scan, level, number, key, reference = (
        header.index(name) for name in ("scan", "level", "point", "key", "reference_key")
    )
    plan: Plan = defaultdict(Planned)
    for row in rows:
        group = plan[row[scan], row[level]]
        group.numbers.append(row[number])
        group.keys.append(row[key])
        group.references.append(row[reference])
    return dict(plan)


def _count(keys: Collection[str], there: set[str], bad: set[str], markers: dict[str, float]) -> Count:
    running = sum(map(markers.__contains__, keys)) if markers else 0
    done = sum(map(there.__contains__, keys))
    again = sum(1 for key in markers if key in there and key in keys) if running else 0
    failed = sum(1 for key in keys if key in bad and key in there and key not in markers) if bad else 0
    return Count(len(keys), done - again - failed, running, failed)


def _keys(root: Path) -> set[str]:
    return {e.name[:-4] for group in entries(root, "") for e in entries(Path(group.path), ".npz")}


def _markers(layout: Layout, jobs: set[str]) -> Iterator[tuple[str, float]]:
    """Give key and age (s) of every calculation at work; markers of dead workers do not count."""
    now = time.time()
    for entry in entries(layout.running("x").parent, ".json"):
        marker = read_json(Path(entry.path))
        if marker is not None and marker.get("job") in jobs:
            try:
                started = datetime.fromisoformat(marker["started"]).timestamp()
            except (KeyError, TypeError, ValueError):
                started = now
            yield entry.name.removesuffix(".json"), max(0.0, now - started)


def _named(plan: Plan, keys: Container[str]) -> dict[str, str]:
    """Return what some keys are, in words."""
    names: dict[str, str] = {}
    for (scan, level), planned in plan.items() if keys else ():
        for number, key, reference in zip(planned.numbers, planned.keys, planned.references, strict=True):
            if reference in keys:
                names.setdefault(reference, f"reference of {scan} {level} {number}")
            if key in keys:
                names[key] = f"{scan} {level} {number}"
    return names


def _longest(seconds: dict[str, float], names: dict[str, str]) -> list[AtWork]:
    """Return calculations, the longest first."""
    found = [AtWork(names.get(key, key), age) for key, age in seconds.items()]
    return sorted(found, key=lambda item: -item.seconds)


def _pace(folder: Path) -> float:
    """Return the records a second that were written lately."""
    return sum(_rate(folder / name) for name in ("records", "references"))


def _rate(root: Path) -> float:
    """Return the records a second below one folder, from the times of a fair sample of them."""
    now, times, looked_at = time.time(), list[float](), 0
    groups = sorted(entry.path for entry in entries(root, ""))
    for group in groups:
        times += [entry.stat().st_mtime for entry in entries(Path(group), ".npz")]
        looked_at += 1
        if len(times) > _SAMPLED:
            break
    if not times:
        return 0.0
    window = min(WINDOW_S, max(1.0, now - min(times)))
    recent = sum(1 for written in times if now - written <= window)
    return recent / window * len(groups) / looked_at


def slowest(table: Path, most: int) -> list[tuple[str, float]]:
    """Return the points that took longest (s), from the table of points of the latest analysis, if any."""
    try:
        with table.open(encoding="utf-8", newline="") as handle:
            rows = csv.reader(handle)
            header = next(rows)
            place = [header.index(name) for name in ("wall_s", "scan", "level", "point")]
            found = [[row[i] for i in place] for row in rows]
    except (FileNotFoundError, StopIteration, ValueError, IndexError):  # none yet, or not such a table
        return []
    timed = [(" ".join(point), float(wall)) for wall, *point in found if wall]
    return heapq.nlargest(most, timed, key=lambda item: item[1])
