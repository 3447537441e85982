"""What one job of the engine does: compute what is missing or requested, then write the job's summary.

A job that is interrupted is simply run again: whatever has its record is not computed twice.
"""

from __future__ import annotations

import heapq
import signal
import time
from collections.abc import Callable
from dataclasses import dataclass, field
from operator import itemgetter
from pathlib import Path
from typing import Any

from scission.execution.guard import Guard, StoppedError
from scission.execution.layout import Layout, read_json, write_json
from scission.execution.ledger import Ledger, record_kind
from scission.execution.markers import (
    Claim,
    ClaimLostError,
    claim,
    clear_running,
    earlier_starts,
    now,
    pending_request,
)
from scission.execution.needs import granted, is_short, needs_again, same_skip, why_no_reference
from scission.execution.outcomes import RESOURCE_REASONS, Outcome, write_failure
from scission.execution.publish import publish
from scission.records.store import Record

TRY_AGAIN = 75
"""Exit status that asks the engine for another attempt with more time and memory."""
SLOWEST = 5
"""How many calculations a summary names that took longest, with their wall time in s."""
_GUARD_MB = 200.0
"""Memory of the guard itself and of the engine's own process in the job."""

Task = dict[str, Any]
Run = Callable[[Task], dict[str, Any]]
Walk = Callable[[dict[str, Any], Ledger, Run], dict[str, Any]]


@dataclass(frozen=True)
class Limits:
    """What the engine granted the job: memory in MB (10^6 bytes), run time in minutes."""

    mem_mb: float = 4000.0
    runtime_min: float = 24 * 60.0

    @property
    def memory_mb(self) -> float:
        """Budget of one calculation, MB."""
        return max(0.5 * self.mem_mb, 0.95 * self.mem_mb - _GUARD_MB)

    def budget_s(self, elapsed_s: float) -> float:
        """Budget of the next calculation: half of the time that is left, so that one that hangs leaves
        time for others, and never less than a quarter of the whole, so that late ones get a chance."""
        whole = 60.0 * self.runtime_min
        return max(0.5 * (whole - elapsed_s), 0.25 * whole)


@dataclass
class Attempt:
    """One run of a job: what it may use, and what it did so far."""

    layout: Layout
    job: str
    guard: Guard
    claim: Claim
    number: int = 1
    last: bool = True
    limits: Limits = field(default_factory=Limits)
    started: float = field(default_factory=time.monotonic)
    starts: dict[str, int] = field(default_factory=dict)
    requests: dict[str, dict[str, Any]] = field(default_factory=dict)
    results: dict[str, str] = field(default_factory=dict)
    times: dict[str, float] = field(default_factory=dict)
    chains: list[dict[str, Any]] = field(default_factory=list)
    total: int = 0
    escalate: bool = False
    physics_version: int | None = None

    def run(self, item: Task) -> dict[str, Any]:
        """Run one calculation under the guard and note how it ended."""
        task = self._task(item)
        try:
            answer = self.guard.run(task)
        except StoppedError as stop:
            if self.last and stop.signum != signal.SIGINT:
                self._give_up(task)
            raise
        self._note(task, answer)
        return answer

    def skip(self, item: Task, why: str) -> None:
        """Record that a point cannot be computed because its reference did not succeed."""
        outcome = Outcome("skipped", "reference-missing", why)
        self._note(
            item, write_failure(Ledger(self.layout.folder, item), self._task(item), outcome, time.time())
        )

    def keep(self, record: Record) -> None:
        """Note a record that needs nothing in this attempt; one that ran short may need the next one, also
        when the run that would have made that attempt was killed."""
        self.escalate |= is_short(record) and granted(record) <= self.number
        self.results[record.key] = record.status
        self.times[record.key] = record.scalars.get("wall_s") or 0.0
        clear_running(self.layout, record.key)

    def _task(self, item: Task) -> Task:
        key = item["key"]
        request = self.requests.setdefault(key, pending_request(self.layout, key) or {})
        kind = record_kind(item)
        if key not in self.starts:
            record = Ledger(self.layout.folder, item).read(kind, key, arrays=False)
            before = max(record.attempts if record else 0, earlier_starts(self.layout, key))
            self.starts[key] = before + 1
        budgets = {
            "budget_s": self.limits.budget_s(time.monotonic() - self.started),
            "memory_mb": self.limits.memory_mb,
        }
        return {
            **budgets,
            **item,
            "attempt": self.starts[key],
            "job_attempt": self.number,
            "request": request.get("id", ""),
            "remedy": item.get("remedy") or request.get("remedy", ""),
            "physics_version": self.physics_version,
        }

    def _give_up(self, task: Task) -> None:
        outcome = Outcome(
            "failed", "scheduler-limit", "the job was told to end before the calculation was done"
        )
        write_failure(Ledger(self.layout.folder, task), task, outcome, time.time())
        clear_running(self.layout, task["key"])

    def _note(self, task: Task, answer: dict[str, Any]) -> None:
        self.results[task["key"]] = answer["status"]
        self.times[task["key"]] = answer.get("wall_s") or 0.0
        if answer["status"] == "failed" and answer.get("reason") in RESOURCE_REASONS:
            self.escalate = True
        print(
            f"{now()} {task['kind']} {task['key']} {answer['status']} {answer.get('reason', '')}", flush=True
        )
        self.claim.tell(self.summary())

    def close_requests(self) -> None:
        """Remove the requests of the calculations that were done; those are in the records now."""
        for key, request in self.requests.items():
            if request:
                self.layout.request(key).unlink(missing_ok=True)

    def summary(self) -> dict[str, Any]:
        """Return the counts and the keys without a good result, for progress and status."""
        bad = {key: status for key, status in self.results.items() if status != "converged"}
        longest = heapq.nlargest(SLOWEST, self.times.items(), key=itemgetter(1))
        counts = {"job": self.job, "total": self.total, "done": len(self.results), "not_good": bad}
        return counts | {"slowest": [(key, round(seconds, 3)) for key, seconds in longest]}


def run_job(
    results: Path,
    job: str,
    attempt: int = 1,
    last_attempt: bool = True,
    limits: Limits | None = None,
    runner: str = "chemistry",
    walk: Walk | None = None,
) -> int:
    """Do one job of the plan below ``results`` (results/<campaign>); return its exit status.

    0: the summary is written and every point of the job has a record.  75: points ran out of time or
    memory and another attempt may do better, or another worker took the job over.  128 + signal: told
    to stop; what is done is kept.

    Raises:
        FileNotFoundError: the plan has no such job.
        ChildStartError: the calculating process cannot be started.
    """
    layout = Layout(results)
    plan = read_json(layout.job_plan(job))
    if plan is None:
        raise FileNotFoundError(
            f"{layout.job_plan(job)}: the plan has no job {job!r}; run `scission check` again"
        )
    with claim(layout, job) as mine, Guard(layout.folder, job, runner, mine.refresh) as guard:
        work = Attempt(layout, job, guard, mine, attempt, last_attempt, limits or Limits())
        work.physics_version = (read_json(layout.plan / "plan.json") or {}).get("physics_version")
        try:
            _do(plan, work, walk)
        except StoppedError as stop:
            print(f"{now()} {stop}", flush=True)
            return 128 + stop.signum
        except ClaimLostError as lost:
            print(f"{now()} {lost}", flush=True)
            return TRY_AGAIN
        work.close_requests()
    if work.escalate and not last_attempt:
        return TRY_AGAIN
    told = {"stage": plan["stage"], "chains": work.chains, "finished": now()}
    write_json(layout.job_done(job), work.summary() | told)
    return 0


def _do(plan: dict[str, Any], work: Attempt, walk: Walk | None) -> None:
    if plan["stage"] == "reference":
        work.total = len(plan["reference_keys"]) + len(plan["publish"])
        _walk_chains(plan, work, walk or _chemistry_walk())
        _publish(plan["publish"], work)
    elif plan["stage"] == "fragments":
        work.total = len(plan["points"])
        _compute_fragments(plan["points"], work)
    else:
        work.total = len(plan["points"])
        _compute_points(plan["points"], work)


def _chemistry_walk() -> Walk:
    from scission.chemistry.walk import walk_chain

    return walk_chain


def _walk_chains(plan: dict[str, Any], work: Attempt, walk: Walk) -> None:
    store = Ledger(work.layout.folder, {})
    for chain in plan["chains"]:
        again = [node["key"] for node in chain.get("nodes", []) if _asked(store, node["key"], work)]
        told = walk({**chain, "again": again}, store, work.run)
        work.chains.append(told)
    for key in plan["reference_keys"]:
        record = store.read("reference", key, arrays=False)
        if record is not None:
            work.keep(record)


def _asked(store: Ledger, key: str, work: Attempt) -> bool:
    """Whether a reference that has a record must be computed again."""
    record = store.read("reference", key, arrays=False)
    return record is not None and needs_again(record, "", work.number, pending_request(work.layout, key))


def _publish(items: list[Task], work: Attempt) -> None:
    for item in items:
        work.keep(publish(item, Ledger(work.layout.folder, item)))


def _compute_points(points: list[Task], work: Attempt) -> None:
    """Compute the points that need it: those that never ran first, so that bad ones hold up nobody."""
    again = []
    for item in points:
        need, task = _examine(item, work)
        if need == "first":
            work.run(task)
        elif need == "again":
            again.append(task)
    for task in again:
        work.run(task)


def _compute_fragments(items: list[Task], work: Attempt) -> None:
    """Compute the fragments without a record, or that ran out of time or memory when less was granted."""
    for item in items:
        record = Ledger(work.layout.folder, item).read("fragment", item["key"], arrays=False)
        request = pending_request(work.layout, item["key"])
        waiting = record is not None and record.reason == "reference-missing"
        if record is None or waiting or needs_again(record, record.reference_stamp, work.number, request):
            work.run(item)
        else:
            work.keep(record)


def _examine(item: Task, work: Attempt) -> tuple[str, Task]:
    """Decide what a point needs: "first", "again" or "nothing"; skipped ones are recorded here."""
    store = Ledger(work.layout.folder, item)
    reference = store.read("reference", item["reference_key"], arrays=False)
    record = store.read("point", item["key"], arrays=False)
    task = {**item, "reference_stamp": reference.stamp if reference else ""}
    if reference is None or reference.status != "converged":
        request = pending_request(work.layout, item["key"])
        if record is None or not same_skip(record, task["reference_stamp"], request):
            work.skip(task, why_no_reference(item["reference_key"], reference))
        else:
            work.keep(record)
        return "nothing", task
    if record is None:
        return "first", task
    request = pending_request(work.layout, item["key"])
    if needs_again(record, reference.stamp, work.number, request):
        return "again", task if request else {"remedy": record.remedy, **task}
    work.keep(record)
    return "nothing", task
