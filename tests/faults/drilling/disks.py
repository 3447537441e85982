"""Faults of the disk: no room, no permission; each on a small file system that is mounted for it."""

import subprocess
from contextlib import contextmanager

from drilling.campaign import StuckError
from drilling.processes import stop_in_the_middle

PLENTY = "200m"
FROM_KB, TO_KB = 700, 4500
"""Room at which a campaign that needs 5.5 MB is caught in its plan, its calculations or its closing steps."""


class SkippedError(Exception):
    """The drill needs what this machine does not allow; the text says what."""


@contextmanager
def mounted(campaign, size):
    """A file system of its own for the results, of the given size."""
    campaign.results.mkdir()
    words = ["mount", "-t", "tmpfs", "-o", f"size={size}", "drill", str(campaign.results)]
    try:
        made = subprocess.run(words, capture_output=True, text=True, check=False)
        problem = made.stderr.strip() if made.returncode else ""
    except FileNotFoundError as error:
        problem = str(error)
    if problem:
        raise SkippedError(f"no file system can be mounted here: {problem}")
    try:
        yield
    finally:
        subprocess.run(["umount", "--lazy", str(campaign.results)], check=True)


def remount(campaign, options):
    """Change the file system of the results."""
    subprocess.run(["mount", "-o", f"remount,{options}", str(campaign.results)], check=True)


def full_disk(campaign):
    """No room left at a random moment; then there is room again."""
    room = campaign.random.randint(FROM_KB, TO_KB)
    with mounted(campaign, f"{room}k"):
        _expect_told(campaign, campaign.run(), "full")
        remount(campaign, f"size={PLENTY}")
        campaign.settle()
        campaign.keep_tables()
    return f"full at {room} kB, told so"


def read_only(campaign):
    """A results folder that cannot be written, after half a run; then it can again."""
    with mounted(campaign, PLENTY):
        stop_in_the_middle(campaign)
        remount(campaign, "ro")
        _expect_told(campaign, campaign.run(), "read-only")
        remount(campaign, "rw")
        campaign.settle()
        campaign.keep_tables()
    return "read-only, told so"


def _expect_told(campaign, done, word):
    """Expect another status than those of a finished run, and one plain line with folder and remedy."""
    lines = [line for line in done.stderr.splitlines() if str(campaign.results) in line and word in line]
    if done.returncode in (0, 2, 3) or not lines or "Traceback" in done.stderr:
        around = done.stderr.find("Traceback") if "Traceback" in done.stderr else -600
        raise StuckError(f"exit status {done.returncode}, said: {done.stderr[around:][:2000]}")
