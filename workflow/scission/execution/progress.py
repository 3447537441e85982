"""How far a campaign is: counted from file names, summaries of jobs and claims of workers; reads only."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from pathlib import Path

from scission.execution.layout import Layout, read_json
from scission.execution.markers import live_workers
from scission.execution.planning import read_points
from scission.records.store import Store


@dataclass(frozen=True)
class Count:
    """Points of one kind: all that are planned, those with a good record, those with a bad one."""

    total: int
    good: int
    failed: int

    @property
    def left(self) -> int:
        """Points without a record."""
        return self.total - self.good - self.failed

    @property
    def done(self) -> int:
        """Points with a record."""
        return self.good + self.failed


@dataclass
class Progress:
    """Counts of one campaign, taken again and again; what cannot change is read once."""

    layout: Layout
    groups: dict[tuple[str, str], list[str]] = field(default_factory=dict)
    references: set[str] = field(default_factory=set)
    _summaries: dict[Path, tuple[int, dict[str, str]]] = field(default_factory=dict)

    @classmethod
    def of(cls, layout: Layout) -> Progress:
        """Read what is planned.

        Raises:
            FileNotFoundError: the campaign has no plan yet.
        """
        progress = cls(layout)
        for row in read_points(layout):
            progress.groups.setdefault((row["scan"], row["level"]), []).append(row["key"])
            progress.references.add(row["reference_key"])
        return progress

    def by_group(self) -> dict[tuple[str, str], Count]:
        """Return the counts by scan and level."""
        there, bad = Store(self.layout.folder).keys("point"), self._not_good()
        return {group: _count(keys, there, bad) for group, keys in self.groups.items()}

    def points(self) -> Count:
        """Return the counts of all planned points."""
        return _sum(self.by_group().values())

    def reference_count(self) -> Count:
        """Return the counts of the references that points are built on."""
        return _count(list(self.references), Store(self.layout.folder).keys("reference"), self._not_good())

    def running(self) -> list[str]:
        """Return the jobs at work at present."""
        return live_workers(self.layout)

    def _not_good(self) -> dict[str, str]:
        """Return key -> status of records without a good result, as far as jobs have told."""
        told: dict[str, str] = {}
        for folder in (self.layout.job_done("x").parent, self.layout.worker("x").parent):
            for path in folder.glob("[!.]*.json"):
                told |= self._told(path)
        return told

    def _told(self, path: Path) -> dict[str, str]:
        try:
            changed = path.stat().st_mtime_ns
        except FileNotFoundError:  # a worker that has just ended
            return {}
        kept = self._summaries.get(path)
        if kept is None or kept[0] != changed:
            content = read_json(path) or {}
            kept = self._summaries[path] = (changed, dict(content.get("not_good", {})))
        return kept[1]


def _count(keys: list[str], there: set[str], bad: Mapping[str, str]) -> Count:
    n = Counter("left" if k not in there else "failed" if k in bad else "good" for k in keys)
    return Count(len(keys), n["good"], n["failed"])


def _sum(counts: Iterable[Count]) -> Count:
    listed = list(counts)
    return Count(sum(c.total for c in listed), sum(c.good for c in listed), sum(c.failed for c in listed))


def duration(seconds: float) -> str:
    """Return a time in words that a person reads at a glance."""
    if seconds < 90:
        return f"{max(1, round(seconds))} s"
    if seconds < 90 * 60:
        return f"{round(seconds / 60)} min"
    return f"{seconds / 3600:.1f} h"
