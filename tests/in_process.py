"""A campaign computed in this process, without the engine: job after job, task after task."""

from pathlib import Path

import pyscf.lib
from scission.analysis import Analysis, analyse
from scission.campaign import Campaign, load_campaign
from scission.chemistry.tasks import run_task
from scission.chemistry.walk import walk_chain
from scission.execution.ledger import Ledger
from scission.execution.publish import publish
from scission.plan import make_plan
from scission.records import Store

pyscf.lib.num_threads(1)


def compute(text: str, folder: Path) -> tuple[Campaign, Store]:
    """The campaign of a YAML text, and its records below ``folder``."""
    file = folder / "campaign.yaml"
    file.write_text(text)
    campaign, store = load_campaign(file), Store(folder)
    for job in make_plan(campaign).jobs:
        for chain in job.payload.get("chains", []):
            walk_chain(chain, store, lambda task: run_task({"attempt": 1, **task}, store))
        for item in job.payload.get("publish", []):
            publish(item, Ledger(folder, item))
        for item in job.payload.get("points", []):
            attempt_task(item, store)
    return campaign, store


def attempt_task(item, store):
    """One task; what it raises leaves no record, as the guard would have made one of a failure."""
    try:
        run_task({"attempt": 1, **item}, store)
    except (RuntimeError, ValueError) as error:
        print(f"{item['key']}: {error}")


def tables(text: str, folder: Path) -> Analysis:
    """The analysis of a campaign that is computed here."""
    campaign, store = compute(text, folder)
    return analyse(make_plan(campaign).points, campaign, store)
