"""Whole runs that are killed: the next one goes on by itself, loses nothing and repeats nothing."""

import os
import signal
import time

import psutil
import pytest
from scission.execution.layout import read_json
from small_campaign import COSTS, Campaign


@pytest.fixture
def campaign(tmp_path):
    """A campaign that never ran."""
    return Campaign(tmp_path)


@pytest.fixture(scope="module")
def undisturbed(tmp_path_factory):
    """The tables of the same campaign without any fault."""
    campaign = Campaign(tmp_path_factory.mktemp("undisturbed"))
    assert campaign.run().returncode == 0
    return campaign.rows(without=(*COSTS, "attempts"))


def wait_for(condition, timeout_s=90.0):
    """Wait until something is so."""
    deadline = time.monotonic() + timeout_s
    while not condition():
        assert time.monotonic() < deadline, "waited in vain"
        time.sleep(0.05)


def start_and_catch(campaign, key):
    """Start a run that pauses in the calculation of ``key``; give its processes once it is there."""
    run = campaign.start(drill={key: "pause"})
    wait_for(campaign.layout.running(key).exists)
    engine = psutil.Process(read_json(campaign.layout.run_file)["engine"]["pid"])
    return run, engine


@pytest.mark.slow
@pytest.mark.parametrize("victims", ["command", "command and engine", "everything"])
def test_after_kill_9_the_next_run_gives_the_same_tables(campaign, undisturbed, victims):
    """Orphans are waited for, the engine's lock is freed, no point is computed twice."""
    key = campaign.key("cc", 3)
    run, engine = start_and_catch(campaign, key)
    workers = engine.children(recursive=True)
    run.kill()
    run.wait()
    if victims != "command":
        engine.kill()
    if victims == "everything":
        for process in workers:
            process.kill()
    again = campaign.run()

    assert again.returncode == 0, again.stderr
    assert campaign.rows(without=(*COSTS, "attempts")) == undisturbed
    attempts = {row["key"]: row["attempts"] for row in campaign.rows()}
    assert attempts.pop(key) == ("2" if victims == "everything" else "1")
    assert set(attempts.values()) == {"1"}


@pytest.mark.slow
def test_a_second_run_at_the_same_time_is_told(campaign):
    """It exits at once with another status than 0, 2 and 3; the first goes on to its good end."""
    run, _ = start_and_catch(campaign, campaign.key("cc", 3))
    second = campaign.run()
    run.communicate()

    assert second.returncode == 1
    assert "is being run already, by process" in second.stderr
    assert run.returncode == 0


@pytest.mark.slow
@pytest.mark.parametrize("number", [signal.SIGTERM, signal.SIGINT])
def test_a_run_that_is_told_to_stop_stops_and_can_go_on(campaign, undisturbed, number):
    """Nothing stays at work; the point it was in is computed by the next run."""
    key = campaign.key("cc", 3)
    run, engine = start_and_catch(campaign, key)
    workers = engine.children(recursive=True)
    os.kill(run.pid, number)
    run.communicate(timeout=60)
    _, alive = psutil.wait_procs([engine, *workers], timeout=5.0)

    assert run.returncode == 130
    assert alive == []
    assert campaign.run().returncode == 0
    assert campaign.rows(without=(*COSTS, "attempts")) == undisturbed


@pytest.mark.slow
def test_a_worker_that_is_killed_costs_one_attempt_of_one_point(campaign, undisturbed):
    """The engine starts the job again, which goes on where it was."""
    key = campaign.key("cc", 3)
    run, _ = start_and_catch(campaign, key)
    os.kill(read_json(campaign.layout.running(key))["pid"], signal.SIGKILL)
    run.communicate()

    assert run.returncode == 0
    assert campaign.rows(without=(*COSTS, "attempts")) == undisturbed
    assert {row["key"] for row in campaign.rows() if row["attempts"] != "1"} == {key}


@pytest.mark.slow
def test_a_job_that_dies_again_and_again_does_not_keep_the_rest_back(campaign):
    """What there is, is brought together; the points of the dead job are listed as lost."""
    key = campaign.key("cc", 3)
    run, _ = start_and_catch(campaign, key)
    first = read_json(campaign.layout.running(key))["pid"]
    os.kill(first, signal.SIGKILL)
    wait_for(lambda: (read_json(campaign.layout.running(key)) or {"pid": first})["pid"] != first)
    os.kill(read_json(campaign.layout.running(key))["pid"], signal.SIGKILL)
    run.communicate()

    assert run.returncode == 3
    assert len(campaign.rows()) == 12
    assert {"lost"} == {row["status"] for row in campaign.rows("failures.csv")}
    assert campaign.run().returncode == 0
