"""Write a plan to its folder, and find out quickly whether the one that lies there still holds."""

from __future__ import annotations

import json
import os
import tempfile
from pathlib import Path
from typing import TYPE_CHECKING, Any

from scission.campaign import Campaign
from scission.physics import PHYSICS_VERSION

from .identity import canonical, digest

if TYPE_CHECKING:
    from .types import Plan

FORMAT = 1


def campaign_digest(campaign: Campaign, block_seconds: float) -> str:
    """Return a digest of everything a plan depends on: the file, its molecules, versions, block size."""
    molecules = {
        name: [list(m.symbols), m.positions.tolist(), m.charge, m.multiplicity]
        for name, m in campaign.molecules.items()
    }
    return digest(canonical([FORMAT, PHYSICS_VERSION, block_seconds, campaign.source_text, molecules]))


def write_plan(plan: Plan, folder: Path) -> None:
    """Write ``plan`` to ``folder`` (results/<campaign>/plan): job files first, the index last, each whole."""
    jobs = folder / "jobs"
    jobs.mkdir(parents=True, exist_ok=True)
    for job in plan.jobs:
        target = jobs / f"{job.id}.json"
        if not target.exists():  # its name is a digest of its content
            write_text(target, json.dumps({"job": job.id, "stage": job.stage, **job.payload}))
    write_text(folder / "campaign.yaml", plan.campaign.source_text)
    write_text(folder / "plan.json", json.dumps(_index(plan), indent=1))


def read_index(folder: Path) -> dict[str, Any] | None:
    """Return the plan's index, or ``None`` where there is none or it has another format."""
    try:
        index = json.loads((folder / "plan.json").read_text(encoding="utf-8"))
    except (FileNotFoundError, json.JSONDecodeError):
        return None
    return index if isinstance(index, dict) and index.get("plan") == FORMAT else None


def write_text(path: Path, text: str) -> None:
    """Write ``text`` to ``path`` whole or not at all."""
    handle, name = tempfile.mkstemp(dir=path.parent, prefix=".tmp-")
    try:
        with os.fdopen(handle, "w", encoding="utf-8") as stream:
            stream.write(text)
            stream.flush()
            os.fsync(stream.fileno())
        os.replace(name, path)
    except BaseException:
        Path(name).unlink(missing_ok=True)
        raise


def _index(plan: Plan) -> dict[str, Any]:
    return {
        "plan": FORMAT,
        "campaign": plan.campaign.name,
        "digest": plan.digest,
        "physics_version": plan.physics_version,
        "n_points": len(plan.points),
        "jobs": [
            {
                "job": job.id,
                "stage": job.stage,
                "needs": list(job.needs),
                "points": job.n_points,
                "mem_mb": job.mem_mb,
                "runtime_min": job.runtime_min,
            }
            for job in plan.jobs
        ],
    }
