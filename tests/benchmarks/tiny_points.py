"""Tiny points: H2 in a minimal basis, and what their chemistry costs without the program around it."""

from __future__ import annotations

import csv
import tempfile
import time
from pathlib import Path
from typing import Any

LENGTHS = 100
LEVELS = {
    "hf": "{reference: RHF, basis: sto-3g}",
    "cc": "{reference: RHF, correlation: CCSD, basis: sto-3g}",
}
POINTS_OF_A_SCAN = LENGTHS * len(LEVELS)
FROM, TO, SHIFT = 0.5, 3.0, 1.0e-4
"""Ends of the first scan, and by how much each scan is moved (angstrom), so that no two share a point."""


def campaign_text(scans: int) -> str:
    """A campaign of that many scans of one bond."""
    lines = [
        "campaign: tiny",
        "molecules:",
        '  h2: {charge: 0, multiplicity: 1, atoms: "H 0 0 0\\nH 0 0 0.74"}',
    ]
    lines += ["levels:", *(f"  {name}: {level}" for name, level in LEVELS.items()), "scans:"]
    for i in range(scans):
        grid = f"{{from: {FROM + i * SHIFT:.4f}, to: {TO + i * SHIFT:.4f}, points: {LENGTHS}}}"
        levels = ", ".join(LEVELS)
        lines.append(
            f"  s{i}: {{molecule: h2, levels: [{levels}], stretch: {{bond: [H1, H2], lengths: {grid}}}}}"
        )
    return "\n".join(lines) + "\n"


def chemistry_s(scans: int) -> float:
    """Return the processor time (s a point) of the functions that compute records, for the first scans."""
    import pyscf.lib
    from scission.campaign import load_campaign
    from scission.chemistry.tasks import TASKS
    from scission.chemistry.walk import walk_chain
    from scission.plan import make_plan
    from scission.records import Store

    pyscf.lib.num_threads(1)
    used = 0.0

    def plainly(task: dict[str, Any]) -> dict[str, Any]:
        nonlocal used
        started = time.process_time()
        record = TASKS[task["kind"]]({"attempt": 1, **task}, store, _stopwatch())
        used += time.process_time() - started
        store.write(record)
        return {"key": record.key, "status": record.status, "reason": record.reason}

    with tempfile.TemporaryDirectory() as folder:
        sample = Path(folder) / "sample.yaml"
        sample.write_text(campaign_text(scans), encoding="utf-8")
        plan, store = make_plan(load_campaign(sample)), Store(folder)
        for job in plan.jobs:
            for chain in job.payload.get("chains", []):
                walk_chain(chain, store, plainly)
            for item in job.payload.get("points", []) if job.stage == "correlate" else []:
                plainly(item)
        return used / len(plan.points)


def _stopwatch() -> Any:
    from scission.chemistry.recording import Stopwatch

    return Stopwatch()


def library_s(scans: int) -> float:
    """Return the processor time (s a point) of a loop that calls RHF, and CCSD on top, and nothing else."""
    from pyscf import cc, gto, scf

    started = time.process_time()
    for i in range(scans):
        for n in range(LENGTHS):
            length = FROM + i * SHIFT + (TO - FROM) * n / (LENGTHS - 1)
            for level in LEVELS:
                field = scf.RHF(gto.M(atom=f"H 0 0 0; H 0 0 {length}", basis="sto-3g", verbose=0)).run()
                if level == "cc":
                    cc.CCSD(field).run()
    return (time.process_time() - started) / (scans * POINTS_OF_A_SCAN)


def steps(folder: Path) -> dict[str, float]:
    """Return the wall time (s) of the closing steps of a campaign."""
    found = {}
    for name in ("analyse", "gather", "report"):
        with (folder / "benchmarks" / f"{name}.tsv").open(newline="") as handle:
            found[name] = float(next(csv.DictReader(handle, delimiter="\t"))["s"])
    return found
