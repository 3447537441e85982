"""A real Slurm of one node, a real campaign through it.  Needs root and the packages slurm-wlm and munge:

tests/cluster/slurm install && .venv/bin/python -m pytest -m cluster tests/cluster
"""

import os
import shutil
import subprocess
import tempfile
from pathlib import Path

import pytest
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


def run(campaign, *words, drill=None):
    """Run a campaign on the cluster."""
    words = ("run", str(campaign.file), "--results", str(campaign.results), *QUICK, *words)
    return campaign.finish(campaign.command(*words), drill, timeout=500)


@pytest.mark.usefixtures("slurm")
def test_a_campaign_through_slurm_gives_the_tables_of_the_local_machine(folder, tmp_path):
    """Same points, same numbers, same words; only costs differ."""
    (folder / "good").mkdir(exist_ok=True)
    there, here = Campaign(folder / "good"), Campaign(tmp_path)
    process = run(there)

    assert process.returncode == 0, process.stderr
    assert here.run().returncode == 0
    assert there.rows(without=COSTS) == here.rows(without=COSTS)


@pytest.mark.usefixtures("slurm")
def test_points_that_fail_on_slurm_are_listed_and_healed(folder):
    """One point raises, one is killed at each attempt: both are listed, a retry heals both."""
    (folder / "bad").mkdir(exist_ok=True)
    campaign = Campaign(folder / "bad")
    raised, killed = (campaign.key("cc", n) for n in (2, 5))
    first = run(campaign, "--config", "block_seconds=60", drill={raised: "raise", killed: "kill"})

    assert first.returncode == 3, first.stderr
    listed = {row["key"]: (row["reason"], row["attempts"]) for row in campaign.rows("failures.csv")}
    assert listed == {raised: ("raised", "1"), killed: ("killed", "2")}
    second = campaign.finish(campaign.command("retry", str(campaign.layout.failures), *QUICK), timeout=500)
    assert second.returncode == 0, second.stderr
    assert campaign.rows("failures.csv") == []
