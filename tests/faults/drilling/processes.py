"""Faults of processes: killed, told to stop, growing without end, two commands at once."""

import contextlib
import signal
import time

import psutil

from drilling.campaign import GOOD, StuckError

FIRST, LAST = 5, 150
"""Starts of calculations between which a process is hit."""


def hit(campaign, find, number, times=1):
    """Run the command; ``times`` times, at random moments, send a signal to one of the processes ``find`` gives."""
    process = campaign.start()
    moments = sorted(campaign.random.randint(FIRST, LAST) for _ in range(times))
    struck = sum(_strike(campaign, process, find, number, moment) for moment in moments)
    campaign.status = process.wait()
    return f"{struck} hit; exit status {process.returncode}"


def _strike(campaign, process, find, number, moment):
    campaign.wait_for_starts(moment, process)
    time.sleep(0.3 * campaign.random.random())
    while process.poll() is None:
        victims = [v for v in find(campaign, process) if v is not None]
        if victims:
            try:
                campaign.random.choice(victims).send_signal(number)
                return 1
            except psutil.NoSuchProcess:
                continue
        time.sleep(0.01)
    return 0


def worker(campaign, _process):
    """The workers, which are the guards of the calculations."""
    return campaign.workers()


def child(campaign, _process):
    """The processes that calculate."""
    found = []
    for guard in campaign.workers():
        try:
            found += guard.children()
        except psutil.NoSuchProcess:
            continue
    return found


def engine(campaign, _process):
    """The workflow engine."""
    return [campaign.engine()]


def command(_campaign, process):
    """The command itself."""
    return [psutil.Process(process.pid)]


def kill_worker(campaign):
    """SIGKILL to two workers."""
    return hit(campaign, worker, signal.SIGKILL, times=2)


def kill_child(campaign):
    """SIGKILL to three calculations, as a system out of memory does."""
    return hit(campaign, child, signal.SIGKILL, times=3)


def kill_engine(campaign):
    """SIGKILL to the workflow engine."""
    return hit(campaign, engine, signal.SIGKILL)


def kill_command(campaign):
    """SIGKILL to the command."""
    return hit(campaign, command, signal.SIGKILL)


def kill_everything(campaign):
    """SIGKILL to all processes at once, as if the machine had lost power; twice."""
    for _ in range(2):
        stop_in_the_middle(campaign)
    return "killed twice"


def stop_in_the_middle(campaign):
    """Start the command and kill all of it at a random moment of its first half."""
    process = campaign.start()
    done = sum(line[3] == "start" for line in campaign.lines())
    campaign.wait_for_starts(done + campaign.random.randint(FIRST, LAST // 2), process)
    if process.poll() is None:
        own = psutil.Process(process.pid)
        family = [own, *own.children(recursive=True)]
        for member in family:
            with contextlib.suppress(psutil.NoSuchProcess):
                member.kill()
        psutil.wait_procs(family, timeout=10.0)
    process.wait()


def end_worker(campaign):
    """SIGTERM to two workers, as a scheduler does at the time limit."""
    return hit(campaign, worker, signal.SIGTERM, times=2)


def end_command(campaign):
    """SIGTERM to the command."""
    return hit(campaign, command, signal.SIGTERM)


def out_of_memory(campaign):
    """Three calculations that take memory without end, in the first run."""
    campaign.plan()
    rows = [campaign.key("cct", 3), campaign.key("cct", 6), campaign.key("uhf", 4, "reference_key")]
    done = campaign.run(drill=dict.fromkeys(rows, "allocate"))
    reasons = sorted({row["reason"] for row in campaign.rows("failures.csv")})
    if done.returncode != 3 or "memory-limit" not in reasons:
        raise StuckError(f"exit status {done.returncode}, reasons {reasons}")
    return f"exit status 3, {', '.join(reasons)}"


def two_commands(campaign):
    """The same command twice at once."""
    first = campaign.start()
    campaign.wait_for_starts(FIRST, first)
    started = time.monotonic()
    second = campaign.run()
    took = time.monotonic() - started
    campaign.runs -= 1  # no restart: it was refused
    told = "is being run already, by process" in second.stderr
    campaign.status = first.wait()
    if second.returncode != 1 or not told or campaign.status != GOOD:
        raise StuckError(f"second: {second.returncode}, {second.stderr[-200:]}; first: {first.returncode}")
    return f"second told after {took:.0f} s, exit status 1; first 0"
