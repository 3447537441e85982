"""A plan added up: core time by level with its uncertainty, memory, disk, time to finish."""

from __future__ import annotations

import heapq
from collections import defaultdict
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from scission.forecast.calibration import UNKNOWN, Calibration, expectation
from scission.forecast.cost import fragment_seconds, n_functions

if TYPE_CHECKING:
    from scission.plan import Job, Plan

JOB_START_S = 3.0
"""Starting a job: the worker, the process it supervises and the engine in it (measured on one core)."""

_RECONCILE = 0.2
"""Share of a chain's work that its last stage does again where spine and blocks came before."""
_RECORD_MB = 0.013
_PLANNED_MB = 0.008


@dataclass
class Line:
    """What one level asks for by itself, or references of one kind, which levels share, or all fragments."""

    name: str
    calculations: int = 0
    jobs: int = 0
    core_s: float = 0.0
    low_s: float = 0.0
    high_s: float = 0.0
    memory_mb: int = 0

    def add(self, seconds: float, uncertainty: float, calculations: int = 0) -> None:
        """Add calculations of so many seconds together, uncertain by a factor either way."""
        self.calculations += calculations
        self.core_s += seconds
        self.low_s += seconds / uncertainty
        self.high_s += seconds * uncertainty


@dataclass(frozen=True)
class Forecast:
    """What a campaign asks for; times in core seconds, each with a lower and an upper estimate.

    ``durations`` are the expected seconds of the plan's jobs, in its order.
    """

    lines: tuple[Line, ...]
    n_points: int
    disk_mb: float
    calibrated: int
    jobs: Sequence[Job] = field(repr=False)
    durations: tuple[float, ...] = field(repr=False)

    @property
    def total(self) -> Line:
        """All lines together; their errors are taken to go the same way."""
        total = Line("all")
        for line in self.lines:
            total.calculations += line.calculations
            total.jobs += line.jobs
            total.core_s += line.core_s
            total.low_s += line.low_s
            total.high_s += line.high_s
            total.memory_mb = max(total.memory_mb, line.memory_mb)
        return total

    def finish_s(self, cores: int) -> float:
        """Return the seconds until the last job ends, one core a job, in the plan's order."""
        return makespan(self.jobs, self.durations, cores)


def estimate(plan: Plan, calibration: Calibration | None = None) -> Forecast:
    """Return what a plan costs, by the scaling laws and what records have taught."""
    known = calibration or Calibration()
    lines: dict[str, Line] = {}
    durations = []
    disk = _RECORD_MB * len({p.key for p in plan.points}) + _PLANNED_MB * len(plan.points)
    for job in plan.jobs:
        seconds, megabytes = _add_job(job, known, lines)
        durations.append(seconds)
        disk += megabytes
    return Forecast(
        tuple(lines.values()), len(plan.points), disk, known.n_records, plan.jobs, tuple(durations)
    )


def _add_job(job: Job, known: Calibration, lines: dict[str, Line]) -> tuple[float, float]:
    """Add a job to its lines; return its expected seconds and the MB its references take."""
    seconds, megabytes, touched = JOB_START_S, 0.0, []
    for name, count, method, expected, work in _parts(job):
        size = n_functions(work["molecule"], work["spec"])
        spent = expected * known.factor(method, size)
        line = lines.setdefault(name, Line(name))
        line.add(spent, known.uncertainty(method, size), count)
        seconds += spent
        touched.append(line)
        if job.stage == "reference":
            megabytes += count * (_RECORD_MB + 2 * 8 * size**2 / 1e6)
    first = touched[0]
    first.add(JOB_START_S, UNKNOWN)
    first.jobs += 1
    first.memory_mb = max(first.memory_mb, job.mem_mb)
    return seconds, megabytes


Part = tuple[str, int, str, float, dict[str, Any]]


def _parts(job: Job) -> Iterator[Part]:
    """Give (line, calculations, method, expected seconds of all, an example) of what a job does."""
    if job.stage == "reference":
        for chain in job.payload["chains"]:
            method, each = expectation(chain)
            count, effort = _nodes(chain, mended=bool(job.needs))
            yield f"{method} references", count, method, each * effort, chain
    elif job.stage == "fragments":
        for item in job.payload["points"]:
            yield "fragments", 1, "fragment", fragment_seconds(item), item
    else:
        for items in _alike(job.payload["points"]):
            method, each = expectation(items[0])
            extra = f" ({items[0]['calculation']})" if "calculation" in items[0] else ""
            yield f"{items[0]['level']}{extra}", len(items), method, each * len(items), items[0]


def _alike(points: Sequence[dict[str, Any]]) -> Iterable[list[dict[str, Any]]]:
    """Return the points of a block by level: those of one scan at one level cost the same."""
    levels: dict[tuple[str, str], list[dict[str, Any]]] = defaultdict(list)
    for item in points:
        levels[item["level"], item.get("calculation", "")].append(item)
    return levels.values()


def _nodes(chain: dict[str, Any], mended: bool) -> tuple[int, float]:
    """Return how many references a chain, or a part of one, establishes, and how many it takes the time of."""
    n = len(chain["nodes"])
    if chain["phase"] == "block":  # its ends belong to the spine
        return n - 2, n - 2.0
    return (0, _RECONCILE * n) if chain["phase"] == "whole" and mended else (n, float(n))


def makespan(jobs: Sequence[Job], durations: Sequence[float], cores: int) -> float:
    """Return when the last job ends (s) if each takes one core and starts as early as it can, in order."""
    waiting = {job.id: len(job.needs) for job in jobs}
    number = {job.id: i for i, job in enumerate(jobs)}
    followers: dict[str, list[str]] = defaultdict(list)
    for job in jobs:
        for need in job.needs:
            followers[need].append(job.id)
    ready = [number[job.id] for job in jobs if not job.needs]
    running: list[tuple[float, int]] = []
    now = 0.0
    while ready or running:
        while ready and len(running) < cores:
            i = heapq.heappop(ready)
            heapq.heappush(running, (now + durations[i], i))
        now, done = heapq.heappop(running)
        for follower in followers[jobs[done].id]:
            waiting[follower] -= 1
            if waiting[follower] == 0:
                heapq.heappush(ready, number[follower])
    return now
