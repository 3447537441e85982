"""The guard against real faults: every calculation ends as a record, and the next one goes on."""

import os
import signal
import subprocess
import sys
import textwrap
import time
from pathlib import Path

import psutil
import pytest
from scission.execution.guard import ChildStartError, Guard, StoppedError
from scission.execution.layout import Layout, read_json
from scission.records.store import Store


def task(key="k1", **more):
    """A drill's task."""
    return {
        "kind": "correlate",
        "key": key,
        "attempt": 1,
        "reference_stamp": "s",
        "memory_mb": 2000.0,
        **more,
    }


def test_a_good_calculation_leaves_its_record_and_no_marker(tmp_path):
    """The answer comes back, the record lies there, the running marker is gone."""
    with Guard(tmp_path, "job", "drill") as guard:
        answer = guard.run(task(energy=-1.5))

    assert answer["energy"] == -1.5
    assert Store(tmp_path).read("point", "k1").status == "converged"
    assert not Layout(tmp_path).running("k1").exists()


def test_one_child_serves_many_calculations(tmp_path):
    """The child, whose start costs the import of the chemistry, is kept from task to task."""
    with Guard(tmp_path, "job", "drill") as guard:
        pids = {guard.run(task(f"k{i}"))["pid"] for i in range(3)}

    assert len(pids) == 1
    assert not psutil.pid_exists(pids.pop())


@pytest.mark.parametrize(
    ("fault", "reason", "words"),
    [
        ({"drill": "raise"}, "raised", "DrillError: a drill raised this"),
        ({"drill": "kill"}, "killed", "SIGKILL"),
        ({"drill": "hang", "budget_s": 0.5}, "time-limit", "0.5 s"),
        ({"drill": "allocate", "memory_mb": 300.0}, "memory-limit", "the budget is 300 MB"),
        ({"budget_s": 0.0, "sleep_s": 1.0}, "time-limit", "0 s"),
    ],
)
def test_each_fault_becomes_a_status_with_its_reason(tmp_path, fault, reason, words):
    """A calculation that misbehaves is a failed record, and the next one is computed."""
    with Guard(tmp_path, "job", "drill") as guard:
        answer = guard.run(task("bad", **fault))
        after = guard.run(task("good"))

    record = Store(tmp_path).read("point", "bad")
    assert (answer["status"], answer["reason"]) == ("failed", reason)
    assert (record.status, record.reason) == ("failed", reason)
    assert words in record.message
    assert after["status"] == "converged"


def test_what_a_calculation_prints_is_no_answer(tmp_path, capfd):
    """Words on the child's standard output go to the log."""
    with Guard(tmp_path, "job", "drill") as guard:
        answer = guard.run(task(shout=True))

    assert answer["status"] == "converged"
    assert "words of a calculation" in capfd.readouterr().err


@pytest.mark.parametrize("number", [signal.SIGTERM, signal.SIGUSR1, signal.SIGINT])
def test_a_signal_ends_the_calculation_at_once_and_leaves_its_marker(tmp_path, number):
    """The marker says that the calculation was started; no record is written for it."""
    with Guard(tmp_path, "job", "drill") as guard:
        guard.run(task("first"))
        signal.setitimer(signal.ITIMER_REAL, 0.3)
        old = signal.signal(signal.SIGALRM, lambda *_: os.kill(os.getpid(), number))
        started = time.monotonic()
        with pytest.raises(StoppedError):
            guard.run(task("second", drill="hang"))
        signal.signal(signal.SIGALRM, old)

    assert time.monotonic() - started < 5.0
    assert read_json(Layout(tmp_path).running("second"))["attempt"] == 1
    assert Store(tmp_path).read("point", "second") is None


def test_the_child_dies_with_a_guard_that_is_killed(tmp_path):
    """SIGKILL of the guard leaves no calculation behind."""
    text = f"""
        from pathlib import Path
        from scission.execution.guard import Guard
        guard = Guard(Path({str(tmp_path)!r}), "job", "drill")
        print(guard.run({task("first")!r})["pid"], flush=True)
        guard.run({task("second", drill="hang")!r})
    """
    process = subprocess.Popen(
        [sys.executable, "-c", textwrap.dedent(text)], stdout=subprocess.PIPE, text=True
    )
    child = psutil.Process(int(process.stdout.readline()))
    process.kill()
    process.wait()
    _, alive = psutil.wait_procs([child], timeout=5.0)

    assert not alive


def test_a_child_that_cannot_start_is_a_fault_of_the_program(tmp_path):
    """An installation without its chemistry is told at once, not noted as failed points."""
    with Guard(tmp_path, "job", "no-such-runner") as guard, pytest.raises(ChildStartError):
        guard.run(task())

    assert Store(tmp_path).keys("point") == set()


def test_the_guard_imports_no_chemistry():
    """The supervisor stays small: no PySCF in its process."""
    code = (
        "import sys, scission.execution.worker; sys.exit('pyscf' in sys.modules or 'pydantic' in sys.modules)"
    )

    assert subprocess.run([sys.executable, "-c", code], cwd=Path.cwd(), check=False).returncode == 0
