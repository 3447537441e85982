"""What all rules share: the plan of the campaign, made anew if it is out of date, and its jobs."""

import shlex
import sys
from pathlib import Path

from snakemake.exceptions import WorkflowError

from scission.execution.engine import ATTEMPTS, end_with_caller
from scission.execution.layout import PROJECT, read_json
from scission.execution.planning import PlanMissingError, plan_options, refresh


def read_plan():
    """Return the layout of the results and the index of the plan; never anything of chemistry."""
    if not workflow.configfiles:
        raise WorkflowError("name a campaign: --configfile CAMPAIGN.yaml")
    campaign_file = Path(workflow.configfiles[-1])
    results = Path(config.get("results") or PROJECT / "results").absolute()
    try:
        options = plan_options(config)
        return refresh(
            config, campaign_file, results, options, may_write=workflow.is_main_process
        )
    except (ValueError, PlanMissingError) as error:
        raise WorkflowError(f"{campaign_file}:", str(error))


if workflow.is_main_process:
    end_with_caller()
LAYOUT, PLAN = read_plan()
JOBS = {entry["job"]: entry for entry in PLAN["jobs"]}
CAMPAIGN, PYTHON, SCRIPTS = (
    shlex.quote(str(path)).replace("{", "{{").replace("}", "}}")
    for path in (workflow.configfiles[-1], sys.executable, PROJECT / "scripts")
)
GRANTS = read_json(LAYOUT.grants) or {}
SALVAGE = bool(config.get("salvage"))  # gather what there is, compute nothing


def summaries(wildcards):
    """Return the summaries of all jobs; in a salvage only of those that got so far."""
    names = [f"jobs/{job}.json" for job in JOBS]
    return [name for name in names if not SALVAGE or (LAYOUT.folder / name).exists()]


def missing_jobs():
    """Return the jobs without a summary."""
    return [job for job in JOBS if not LAYOUT.job_done(job).exists()]


def needed(wildcards):
    """Return the summaries of the reference jobs that a job builds on."""
    return [f"jobs/{job}.json" for job in JOBS[wildcards.job]["needs"]]


def memory(wildcards, attempt):
    """Return the memory of a job in MB: the forecast's, more in a retry that asks for it, and in a second attempt."""
    return int(
        JOBS[wildcards.job]["mem_mb"] * GRANTS.get(wildcards.job, (1, 1))[1] * attempt
    )


def runtime(wildcards, attempt):
    """Return the run time of a job in minutes, growing in the same way."""
    return int(
        JOBS[wildcards.job]["runtime_min"]
        * GRANTS.get(wildcards.job, (1, 1))[0]
        * attempt
    )


WORKER = (
    f"{PYTHON} {SCRIPTS}/worker.py --results . --job {{wildcards.job}} --attempt {{resources.attempt}} "
    f"--attempts {{params.attempts}} --mem-mb {{resources.mem_mb}} --runtime-min {{resources.runtime}}"
    " > {log} 2>&1"
)
