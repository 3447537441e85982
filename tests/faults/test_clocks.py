"""Clocks that jump or disagree: nobody is taken for dead, nobody waits for ever."""

import os
import subprocess
import sys
import time

import psutil
import pytest
from scission.execution import markers
from scission.execution.layout import Layout, write_json
from scission.execution.processes import identity, is_alive

DAY_S = 86400.0


def test_a_clock_that_is_set_anew_makes_no_process_look_dead(monkeypatch):
    """The system's start, from which wall-clock start times are reckoned, moves with the clock."""
    process = subprocess.Popen([sys.executable, "-c", "input()"], stdin=subprocess.PIPE)
    who = identity(process.pid)
    monkeypatch.setattr(psutil, "boot_time", lambda: time.time() - DAY_S)
    monkeypatch.setattr("psutil._psplatform.boot_time", lambda: time.time() - DAY_S)
    alive = is_alive(who)
    process.communicate(b"\n")

    assert alive
    assert not is_alive(who)


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="only Linux tells one start from another")
def test_the_same_number_after_a_restart_is_another_process():
    """Number and start time may agree by chance; the start of the system does not."""
    assert not is_alive(identity() | {"boot": "another start"})


@pytest.fixture
def claim(tmp_path):
    """The file of a worker on another machine."""
    path = Layout(tmp_path).worker("job")
    write_json(path, {"host": "elsewhere", "pid": 1, "born": 0.0})
    return path


def test_a_claim_from_a_clock_ahead_holds_while_it_is_refreshed(claim, monkeypatch):
    """Each change counts as a sign of life, whatever time it bears."""
    monkeypatch.setattr(markers, "STALE_AFTER_S", 0.2)
    for step in range(4):
        os.utime(claim, (time.time() + DAY_S + step,) * 2)
        time.sleep(0.1)

        assert markers.is_held(claim)


def test_a_claim_from_a_clock_ahead_is_dead_once_nothing_refreshes_it(claim, monkeypatch):
    """It does not hold until this machine's clock has caught up."""
    monkeypatch.setattr(markers, "STALE_AFTER_S", 0.2)
    os.utime(claim, (time.time() + DAY_S,) * 2)
    held = markers.is_held(claim)
    time.sleep(0.3)

    assert held
    assert not markers.is_held(claim)
