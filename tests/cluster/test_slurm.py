"""A real Slurm of one node, a real campaign through it.  Needs root and the packages slurm-wlm and munge:

tests/cluster/slurm install && .venv/bin/python -m pytest -m cluster tests/cluster
"""

import os
import shutil
import signal
import subprocess
import tempfile
import time
from collections import Counter
from pathlib import Path

import pytest
from scission.execution.layout import read_json
from scission.execution.processes import is_alive
from small_campaign import COSTS, Campaign

pytestmark = pytest.mark.cluster

SCRIPT = Path(__file__).with_name("slurm")
QUICK = (
    "--on",
    "slurm",
    "--slurm-init-seconds-before-status-checks",
    "2",
    "--seconds-between-status-checks",
    "2",
)
"""A test does not want to wait as long between two looks at the queue as a cluster's users do."""


@pytest.fixture(scope="module")
def slurm():
    """A running Slurm; everything it writes lies in one folder."""
    if os.geteuid() != 0 or shutil.which("slurmctld") is None:
        pytest.skip("needs root and Slurm: tests/cluster/slurm install")
    folder = Path(tempfile.mkdtemp(prefix="scission-slurm-"))
    subprocess.run([SCRIPT, "start", folder], check=True)
    os.environ["SLURM_CONF"] = str(folder / "slurm.conf")
    yield folder
    subprocess.run([SCRIPT, "stop", folder], check=True)
    del os.environ["SLURM_CONF"]


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    """A folder that jobs of the cluster can reach."""
    return tmp_path_factory.mktemp("campaign")


def start(campaign, *words, **environment):
    """Start a campaign on the cluster without waiting for it."""
    words = campaign.command("run", str(campaign.file), "--results", str(campaign.results), *QUICK, *words)
    return subprocess.Popen(
        words,
        env=campaign.environment(**environment),
        stderr=subprocess.PIPE,
        text=True,
        start_new_session=True,
    )


def queue(*words):
    """Number, state, time limit and comment of the jobs that wait or run."""
    words = ["squeue", "--noheader", "--format=%i %T %l %k", *words]
    lines = subprocess.run(words, check=True, capture_output=True, text=True).stdout.splitlines()
    return [line.split(maxsplit=3) for line in lines]


def wait_for(condition, timeout_s=180.0):
    """Wait until something is so."""
    deadline = time.monotonic() + timeout_s
    while not condition():
        assert time.monotonic() < deadline, f"waited in vain; in the queue: {queue()}"
        time.sleep(0.2)


def calculations(journal):
    """How often each correlated calculation started, and ended."""
    lines = [line.split() for line in journal.read_text().splitlines()]
    return Counter((key, status) for kind, key, _, status in lines if kind == "correlate")


@pytest.mark.usefixtures("slurm")
def test_after_kill_9_of_the_command_the_next_one_computes_nothing_twice(folder, tmp_path):
    """Jobs at work are waited for, those that wait are taken out; the tables are those of the local machine."""
    (folder / "killed").mkdir(exist_ok=True)
    there, here = Campaign(folder / "killed"), Campaign(tmp_path)
    journal = folder / "killed" / "journal"
    small = ("--config", "block_seconds=0.01")  # a job a point: more of them than the node has cores
    drill = {there.key("cc", n): "pause:8" for n in range(1, 7)}
    first = start(there, *small, drill=drill, SCISSION_DRILL_JOURNAL=str(journal))
    wait_for(lambda: any(there.layout.running(key).exists() for key in drill))
    wait_for(
        lambda: (
            {"RUNNING", "PENDING"} <= {state for _, state, _, comment in queue() if "correlate" in comment}
        )
    )
    engine = read_json(there.layout.run_file)["engine"]
    first.kill()
    first.communicate()
    wait_for(lambda: not is_alive(engine), 10.0)
    left = {number for number, *_ in queue()}
    again = start(there, *small, SCISSION_DRILL_JOURNAL=str(journal))
    said = again.communicate(timeout=400)[1]

    assert again.returncode == 0, said
    assert left
    assert "cancelling what an earlier run left in the queue" in said
    assert "waiting for what an earlier run left at work: correlate." in said
    assert queue() == []
    assert {key for key, _ in calculations(journal)} == set(drill)
    assert set(calculations(journal).values()) == {1}
    assert here.run(*small).returncode == 0
    assert there.rows(without=COSTS) == here.rows(without=COSTS)


def correlate_job(campaign, key):
    """Number and time limit (hours, minutes, seconds) of the job that computes ``key`` by now."""
    wait_for(campaign.layout.running(key).exists)
    return next((number, limit) for number, _, limit, comment in queue() if "correlate" in comment)


@pytest.mark.usefixtures("slurm")
def test_jobs_that_are_told_to_end_or_vanish_cost_no_point(folder):
    """SIGTERM, as at a time limit: the job comes back with twice the time.  Gone for good: its points are lost.

    A point that raises is listed too; a retry, on the local machine, heals all.
    """
    (folder / "bad").mkdir(exist_ok=True)
    campaign = Campaign(folder / "bad")
    raised, told, vanished, last = (campaign.key("cc", n) for n in (2, 4, 5, 6))
    drill = {raised: "raise", told: "pause:6", vanished: "pause:60"}
    first = start(campaign, "--config", "block_seconds=60", drill=drill)
    number, limit = correlate_job(campaign, told)
    subprocess.run(["scancel", "--signal=TERM", number], check=True)
    _, doubled = correlate_job(campaign, vanished)
    os.kill(read_json(campaign.layout.running(vanished))["pid"], signal.SIGKILL)
    said = first.communicate(timeout=400)[1]

    assert first.returncode == 3, said
    assert minutes(doubled) == 2 * minutes(limit)
    listed = {row["key"]: (row["reason"], row["attempts"]) for row in campaign.rows("failures.csv")}
    assert listed == {raised: ("raised", "1"), vanished: ("lost", "1"), last: ("lost", "0")}
    attempts = {row["key"]: row["attempts"] for row in campaign.rows() if row["status"] == "converged"}
    assert {key for key, n in attempts.items() if n != "1"} == {told}
    again = campaign.retry()
    assert again.returncode == 0, again.stderr
    assert campaign.rows("failures.csv") == []


def minutes(limit):
    """A time limit as squeue writes it, in minutes."""
    hours, minute = ([0, *map(int, limit.split(":"))])[-3:-1]
    return 60 * hours + minute
