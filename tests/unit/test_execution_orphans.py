"""What an earlier, killed run left: jobs in Slurm's queue, runs and workers on other machines."""

import os
import subprocess
import sys
import threading
import time

import pytest
from scission.execution import markers, orphans, runfile, slurm
from scission.execution.layout import Layout, read_json, write_json
from scission.execution.markers import Claim, ClaimLostError, claim, live_workers
from scission.execution.orphans import OrphansError, Settling
from scission.execution.processes import identity
from scission.execution.runfile import AlreadyRunningError, hold
from scission.execution.worker import TRY_AGAIN, run_job
from scission.records.store import Record, Store

NAME = "scission-h2-0123456789"
ELSEWHERE = {"host": "elsewhere", "pid": 1, "born": 0.0}


@pytest.fixture
def layout(tmp_path):
    """Results of a campaign."""
    return Layout(tmp_path / "h2")


@pytest.fixture
def queue(tmp_path, monkeypatch):
    """A queue in a file, with commands that show it, take jobs out, and note how they were called."""
    commands = tmp_path / "bin"
    commands.mkdir()
    state = tmp_path / "queue"
    scripts = {
        "squeue": f'cat "{state}"',
        "scancel": f'echo "$*" >> "{tmp_path}/cancelled"\n'
        f'for w in "$@"; do case $w in --signal=INT) exit 0;; esac; sed -i "/^$w|/d" "{state}"; done',
    }
    for name, text in scripts.items():
        (commands / name).write_text(f"#!/bin/sh\n{text}\n")
        (commands / name).chmod(0o755)
    monkeypatch.setenv("PATH", f"{commands}:{os.environ['PATH']}")
    monkeypatch.setattr(orphans, "_BETWEEN_TRIES_S", 0.0)
    monkeypatch.setattr(orphans, "_LOOK_EVERY_S", 0.5)
    return state


def job(number, state, name=f"{NAME}_uuid", what="correlate.h2.cc.aa"):
    """A line of squeue."""
    return f"{number}|{state}|someone|{name}|rule_correlate_wildcards_{what}\n"


def test_only_jobs_that_did_not_start_are_cancelled(layout, queue):
    """Those at work are named and waited for; jobs of other runs are left alone."""
    mine = job(1, "PENDING") + job(2, "RUNNING", what="correlate.h2.cc.bb")
    other = job(3, "PENDING", name="another_uuid") + job(4, "PENDING", name=f"{NAME}9_uuid")
    queue.write_text(mine + other)
    threading.Timer(1.5, lambda: queue.write_text(other)).start()
    said = []
    Settling(layout, {"pid": 1}, said.append).settle(NAME)

    assert (queue.parent / "cancelled").read_text().splitlines()[0] == "--state=PENDING 1"
    assert queue.read_text() == other
    assert "not started yet: correlate.h2.cc.aa (Slurm job 1 of someone, pending)" in said[0]
    assert "at work: correlate.h2.cc.bb (Slurm job 2 of someone, running)" in said[1]


def test_jobs_at_work_are_ended_if_a_person_says_so(layout, queue, monkeypatch):
    """They are told to stop first, which lets workers tidy up, and ended after a while."""
    monkeypatch.setattr(orphans, "_GRACE_S", 0.2)
    queue.write_text(job(2, "RUNNING"))
    Settling(layout, {"pid": 1}, print, policy="cancel").settle(NAME)

    assert (queue.parent / "cancelled").read_text().splitlines() == ["--signal=INT 2", "2"]


@pytest.mark.parametrize(
    ("command", "words"),
    [("exit 127", "status 127"), ("echo no controller >&2; exit 1", "no controller"), ("echo x", "'x'")],
)
def test_a_queue_that_does_not_answer_stops_the_next_run_with_advice(layout, queue, command, words):
    """Going on blindly could compute points twice."""
    (queue.parent / "bin" / "squeue").write_text(f"#!/bin/sh\n{command}\n")

    with pytest.raises(OrphansError, match=f"(?s){words}.*--orphans none"):
        Settling(layout, {"pid": 1}, print).settle(NAME)


def test_without_any_sign_of_left_jobs_a_missing_queue_stops_nothing(layout, monkeypatch):
    """Results copied from a cluster can be gone on with on a machine without Slurm."""
    monkeypatch.setenv("PATH", "/nowhere")
    monkeypatch.setattr(orphans, "_BETWEEN_TRIES_S", 0.0)
    said = []
    Settling(layout, {"queue": {"name": NAME}}, said.append).settle(NAME)

    assert "squeue is not to be found on this machine" in said[0]


def test_a_missing_queue_and_a_live_worker_elsewhere_stop_the_next_run(layout, monkeypatch):
    """The worker is named."""
    monkeypatch.setenv("PATH", "/nowhere")
    monkeypatch.setattr(orphans, "_BETWEEN_TRIES_S", 0.0)
    write_json(layout.worker("correlate.a"), ELSEWHERE)

    with pytest.raises(OrphansError, match=r"signs of life: correlate\.a"):
        Settling(layout, {}, print).settle(NAME)


def test_claims_of_slurm_jobs_that_are_gone_do_not_hold(layout, queue):
    """Nobody waits for a node that died, once Slurm says that the job is gone."""
    queue.write_text("")
    write_json(layout.worker("correlate.a"), ELSEWHERE | {"slurm_job": "7"})
    Settling(layout, {"pid": 1}, print).settle(NAME)

    assert live_workers(layout) == []


def test_filters_of_a_person_hide_no_job(queue, monkeypatch):
    """squeue heeds variables; those must not reach it."""
    monkeypatch.setenv("SQUEUE_STATES", "COMPLETED")
    (queue.parent / "bin" / "squeue").write_text('#!/bin/sh\necho "1|$SQUEUE_STATES|u|n|c"\n')

    assert slurm.listing()[0].state == ""


def test_an_engine_that_is_at_work_still_is_followed(layout):
    """Where it could not be ended together with its command."""
    engine = subprocess.Popen([sys.executable, "-c", "import time; time.sleep(1)"])
    said = []
    Settling(layout, {"engine": identity(engine.pid)}, said.append, engine.poll).settle()

    assert engine.poll() == 0
    assert f"process {engine.pid}" in said[0]


def test_a_run_on_another_machine_is_known_by_its_signs_of_life(layout, monkeypatch):
    """Only a change of the file counts, whatever the clocks say; without one the run is dead."""
    monkeypatch.setattr(runfile, "STALE_AFTER_S", 1.0)
    write_json(layout.run_file, ELSEWHERE)
    threading.Timer(0.3, lambda: os.utime(layout.run_file, (time.time() - 50, time.time() - 50))).start()
    with pytest.raises(AlreadyRunningError, match="process 1 on elsewhere"), hold(layout):
        pass
    with hold(layout) as run:
        assert run.left["host"] == "elsewhere"


def test_of_two_that_start_at_once_without_locks_one_is_told(layout, monkeypatch):
    """The one that wrote last goes on."""
    monkeypatch.setattr(runfile.fcntl, "flock", lambda *_: None)
    threading.Timer(0.2, lambda: layout.run_file.write_text('{"pid": 1, "host": "elsewhere"}')).start()

    with pytest.raises(AlreadyRunningError, match="on elsewhere"), hold(layout, confirm_s=0.5):
        pass


def test_a_run_that_was_taken_over_notices_and_leaves_the_file_alone(layout, monkeypatch):
    """As after a machine that slept for an hour."""
    monkeypatch.setattr(runfile, "HEARTBEAT_S", 0.05)
    with hold(layout) as run:
        layout.run_file.write_text('{"pid": 1, "host": "elsewhere"}')
        time.sleep(0.3)

        assert run.lost
    assert read_json(layout.run_file)["host"] == "elsewhere"


def test_a_run_gives_signs_of_life_whatever_it_is_busy_with(layout, monkeypatch):
    """The file's time moves while the run only sleeps."""
    monkeypatch.setattr(runfile, "HEARTBEAT_S", 0.05)
    with hold(layout):
        before = layout.run_file.stat().st_mtime_ns
        time.sleep(0.3)

        assert layout.run_file.stat().st_mtime_ns > before


def test_the_next_run_finds_the_jobs_by_the_same_name_and_a_copy_does_not(layout, tmp_path):
    """A name fits the engine's rule for it; copied results must never touch the jobs of the original."""
    with hold(layout) as run:
        name = run.queue_name(layout)
        run.note(queue={"name": name, "folder": str(layout.folder)})
    copy = Layout(tmp_path / "copy" / "h2")
    copy.folder.mkdir(parents=True)
    copy.run_file.write_bytes(layout.run_file.read_bytes())
    with hold(layout) as run:
        assert run.left == {"queue": {"name": name, "folder": str(layout.folder)}}
        assert run.queue_name(layout) == name
    with hold(copy) as run:
        assert run.queue_name(copy) != name
    moved = layout.folder.rename(tmp_path / "moved")
    with hold(Layout(moved)) as run:
        assert run.queue_name(Layout(moved)) == name


def test_a_claim_is_refreshed_while_a_point_runs(tmp_path, monkeypatch):
    """So that a long calculation on another machine is not taken for dead."""
    monkeypatch.setattr(markers, "REFRESH_S", 0.0)
    layout = one_point(tmp_path, sleep_s=2.0)
    ages = []
    watching = threading.Thread(target=watch, args=(layout.worker("j"), layout.running("aa"), ages))
    watching.start()

    assert run_job(tmp_path, "j", runner="drill") == 0
    watching.join()
    assert len(set(ages)) >= 4


def watch(worker, marker, times):
    """Collect the times of a claim while a point runs."""
    deadline = time.monotonic() + 30.0
    while not marker.exists() and time.monotonic() < deadline:
        time.sleep(0.02)
    while marker.exists() and time.monotonic() < deadline:
        if worker.exists():
            times.append(worker.stat().st_mtime_ns)
        time.sleep(0.1)


def one_point(folder, **more):
    """A job of one drill."""
    point = {"kind": "correlate", "key": "aa", "reference_key": "ref", "memory_mb": 2000.0, **more}
    write_json(Layout(folder).job_plan("j"), {"job": "j", "stage": "correlate", "points": [point]})
    Store(folder).write(Record(key="ref", kind="reference", status="converged", stamp="s"))
    return Layout(folder)


def test_a_worker_whose_job_was_taken_over_stops_and_asks_to_be_started_again(tmp_path, monkeypatch):
    """Never two writers; the claim of the other one stays."""
    monkeypatch.setattr(markers, "REFRESH_S", 0.0)
    layout = one_point(tmp_path, sleep_s=30.0)

    def take_over():
        while not layout.running("aa").exists():
            time.sleep(0.02)
        write_json(layout.worker("j"), ELSEWHERE)

    threading.Thread(target=take_over, daemon=True).start()

    assert run_job(tmp_path, "j", runner="drill") == TRY_AGAIN
    assert read_json(layout.worker("j")) == ELSEWHERE
    assert Store(tmp_path).read("point", "aa") is None


def test_of_many_that_claim_a_job_one_has_it_at_a_time(layout):
    """Also when a dead claim is in the way."""
    write_json(layout.worker("j"), {**identity(), "pid": 2**22 + 1})
    inside, most = [], []

    def work():
        with claim(layout, "j", poll_s=0.02):
            inside.append(1)
            most.append(len(inside))
            time.sleep(0.05)
            inside.pop()

    threads = [threading.Thread(target=work) for _ in range(4)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()

    assert most == [1, 1, 1, 1]


def test_a_claim_that_was_removed_is_made_again(layout, monkeypatch):
    """By whoever took a live worker for dead, and has not claimed the job."""
    monkeypatch.setattr(markers, "REFRESH_S", 0.0)
    mine = Claim(layout.worker("j"))
    mine.take()
    mine.path.unlink()
    mine.refresh()

    assert read_json(mine.path)["pid"] == os.getpid()
    write_json(mine.path, ELSEWHERE)
    with pytest.raises(ClaimLostError, match="elsewhere"):
        mine.refresh()


def test_points_that_ran_short_get_their_second_attempt_after_a_kill_too(tmp_path):
    """The next run's engine counts from one again; the record says what was granted."""
    one_point(tmp_path, drill="kill")

    assert run_job(tmp_path, "j", 1, last_attempt=False, runner="drill") == TRY_AGAIN
    assert run_job(tmp_path, "j", 1, last_attempt=False, runner="drill") == TRY_AGAIN
    assert Store(tmp_path).read("point", "aa").attempts == 1
    assert run_job(tmp_path, "j", 2, last_attempt=True, runner="drill") == 0
    assert run_job(tmp_path, "j", 1, last_attempt=False, runner="drill") == 0
    assert Store(tmp_path).read("point", "aa").attempts == 2
