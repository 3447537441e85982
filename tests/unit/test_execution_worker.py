"""One job: what is computed, what is left alone, what is written at its end."""

import pytest
from scission.execution.layout import Layout, read_json, write_json
from scission.execution.markers import claim, mark_running
from scission.execution.worker import TRY_AGAIN, Limits, run_job
from scission.records.store import Record, Store

JOB = "correlate.s.cc.0000"


def point(key, **more):
    """A point of a drill whose reference is ``ref``."""
    return {"kind": "correlate", "key": key, "reference_key": "ref", "memory_mb": 2000.0, **more}


def lay(folder, points, reference_status="converged", stamp="s1"):
    """Write a job of these points and their reference's record."""
    write_json(Layout(folder).job_plan(JOB), {"job": JOB, "stage": "correlate", "points": points})
    reference = Record(key="ref", kind="reference", status=reference_status, stamp=stamp, message="no luck")
    Store(folder).write(reference)
    Layout(folder).job_done(JOB).unlink(missing_ok=True)


def run(folder, **more):
    """Run the job with the drills' runner."""
    return run_job(folder, JOB, runner="drill", **more)


def record(folder, key):
    """The record of a point."""
    return Store(folder).read("point", key)


def ask_again(folder, key, request="r1", remedy=""):
    """Write a request to compute a point again."""
    write_json(Layout(folder).request(key), {"id": request, "remedy": remedy})


def test_a_job_computes_its_points_and_says_so_last(tmp_path):
    """Every point has a record, the summary counts them."""
    lay(tmp_path, [point("aa"), point("bb", drill="raise")])

    assert run(tmp_path) == 0
    summary = read_json(Layout(tmp_path).job_done(JOB))
    assert (summary["done"], summary["total"], summary["not_good"]) == (2, 2, {"bb": "failed"})


def test_a_second_run_computes_nothing(tmp_path):
    """Points with a record, good or failed, are left alone."""
    lay(tmp_path, [point("aa"), point("bb", drill="raise")])
    run(tmp_path)
    run(tmp_path)

    assert [record(tmp_path, key).attempts for key in ("aa", "bb")] == [1, 1]


def test_a_point_whose_reference_did_not_succeed_is_skipped_with_the_reason(tmp_path):
    """The message says which reference and why."""
    lay(tmp_path, [point("aa")], reference_status="unconverged")
    run(tmp_path)
    found = record(tmp_path, "aa")

    assert (found.status, found.reason) == ("skipped", "reference-missing")
    assert "ref is unconverged: no luck" in found.message


def test_a_changed_reference_computes_its_points_again(tmp_path):
    """The stamp of the reference record decides."""
    lay(tmp_path, [point("aa", energy=-1.0)])
    run(tmp_path)
    lay(tmp_path, [point("aa", energy=-2.0)], stamp="s2")
    run(tmp_path)
    found = record(tmp_path, "aa")

    assert (found.scalars["energy"], found.attempts, found.history[0]["energy"]) == (-2.0, 2, -1.0)


def test_a_request_is_done_once(tmp_path):
    """The request's file goes once its attempt is in the record; the same request again does nothing."""
    lay(tmp_path, [point("aa", drill="raise"), point("bb")])
    run(tmp_path)
    lay(tmp_path, [point("aa"), point("bb")])
    ask_again(tmp_path, "aa", remedy="damping")
    run(tmp_path)
    ask_again(tmp_path, "aa", remedy="damping")
    run(tmp_path)
    found = record(tmp_path, "aa")

    assert (found.status, found.attempts, found.remedy) == ("converged", 2, "damping")
    assert [entry["reason"] for entry in found.history] == ["raised"]
    assert record(tmp_path, "bb").attempts == 1


def test_a_failed_retry_keeps_the_good_number(tmp_path):
    """The record stays converged, its history grows."""
    lay(tmp_path, [point("aa", energy=-1.0)])
    run(tmp_path)
    lay(tmp_path, [point("aa", drill="raise")])
    ask_again(tmp_path, "aa")
    run(tmp_path)
    found = record(tmp_path, "aa")

    assert (found.status, found.scalars["energy"], found.attempts) == ("converged", -1.0, 2)
    assert [(entry["reason"], entry["request"]) for entry in found.history] == [("raised", "r1")]


def test_time_running_out_asks_for_one_more_attempt_with_more(tmp_path):
    """First attempt: not done, exit 75.  Last attempt: the failure is recorded, exit 0."""
    lay(tmp_path, [point("aa", drill="hang", budget_s=0.2), point("bb")])

    assert run(tmp_path, attempt=1, last_attempt=False) == TRY_AGAIN
    assert not Layout(tmp_path).job_done(JOB).exists()
    assert run(tmp_path, attempt=2, last_attempt=True) == 0
    assert record(tmp_path, "aa").attempts == 2
    assert record(tmp_path, "bb").attempts == 1


def test_a_left_over_marker_counts_its_start(tmp_path):
    """A start that a crash ended counts as an attempt of that point only."""
    lay(tmp_path, [point("aa"), point("bb")])
    mark_running(Layout(tmp_path), "bb", 1, JOB)
    run(tmp_path)

    assert [record(tmp_path, key).attempts for key in ("aa", "bb")] == [1, 2]
    assert not Layout(tmp_path).running("bb").exists()


def test_points_that_never_ran_come_before_those_that_failed(tmp_path):
    """A point that fails again holds up nobody."""
    lay(tmp_path, [point("aa", drill="kill")])
    run(tmp_path, last_attempt=False)
    lay(tmp_path, [point("aa"), point("bb")])
    run(tmp_path, attempt=2)

    assert list(read_json(Layout(tmp_path).job_done(JOB))["not_good"]) == []
    assert record(tmp_path, "bb").provenance["job_attempt"] == 2


def test_a_reference_job_walks_its_chains_and_publishes(tmp_path):
    """The walk is given a store and a way to run tasks; published points follow."""
    job = "reference.s.0000"
    payload = {"chains": [{"name": "c"}], "reference_keys": ["ref"], "publish": [point("aa")]}
    write_json(Layout(tmp_path).job_plan(job), {"job": job, "stage": "reference", **payload})

    def walk(chain, store, run):  # noqa: ARG001
        run({"kind": "reference", "key": "ref", "memory_mb": 2000.0})
        return {"name": chain["name"], "crossings": []}

    assert run_job(tmp_path, job, runner="drill", walk=walk) == 0
    assert record(tmp_path, "aa").reference_stamp == "stamp-ref-1"


def test_a_job_that_is_not_planned_is_an_error_with_its_path(tmp_path):
    """No job, no silent success."""
    with pytest.raises(FileNotFoundError, match="no job 'nope'"):
        run_job(tmp_path, "nope")


def test_a_dead_workers_claim_does_not_hold(tmp_path):
    """A claim names a process by its start time too, so a reused number does not block."""
    write_json(Layout(tmp_path).worker(JOB), {"host": "elsewhere", "pid": 1, "born": 0.0})
    import os

    os.utime(Layout(tmp_path).worker(JOB), (0, 0))
    with claim(Layout(tmp_path), JOB) as mine:
        assert read_json(mine.path)["pid"] == os.getpid()


def test_budgets_leave_time_for_others_and_never_vanish():
    """Half of what is left, at least a quarter of the whole."""
    limits = Limits(mem_mb=1000.0, runtime_min=10.0)

    assert limits.budget_s(0.0) == 300.0
    assert limits.budget_s(590.0) == 150.0
    assert limits.memory_mb == 750.0


def test_a_summary_names_what_took_longest(tmp_path):
    """At most five, the longest first, with seconds; for status, which opens no record."""
    lay(tmp_path, [point(f"p{n}", drill="hang", budget_s=0.1 * n) for n in (1, 3, 2)] + [point("aa")] * 3)
    run(tmp_path)
    told = read_json(Layout(tmp_path).job_done(JOB))["slowest"]

    assert [key for key, _ in told[:3]] == ["p3", "p2", "p1"]
    assert told[0][1] > 0.3
