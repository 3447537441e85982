"""A campaign of 10^5 points whose records are made up: real files of real size, no chemistry.

``python tests/benchmarks/many_records.py SCANS FOLDER`` makes the records of so many scans of 400 points there, gathers
them and prints what that took as JSON.
"""

from __future__ import annotations

import json
import resource
import sys
import time
from pathlib import Path

import numpy as np
import planning
from scission.campaign import load_campaign
from scission.diagnostics import DIAGNOSTICS
from scission.plan import Plan, make_plan
from scission.records.fileformat import pack
from scission.records.gather import gather
from scission.records.store import Record, Store, _head

SYMBOLS = ["C"] * 2 + ["H"] * 6
ORBITALS = 58


def template() -> Record:
    """A coupled-cluster point of a molecule of eight atoms, as large as real ones."""
    drawn = np.random.default_rng(7)
    names = ("t1", "d1", "d2", "largest_t2", "triples_share", "triplet_stability", "homo_lumo_gap", "s2")
    return Record(
        key="key",
        kind="point",
        status="converged",
        stage="correlate",
        scalars={
            "energy": -79.6,
            "energy_reference": -79.2,
            "wall_s": 1.5,
            "cpu_s": 1.4,
            "peak_memory_mb": 210.0,
        },
        diagnostics={name: float(drawn.random()) for name in names},
        absent={
            "uhf_luno": "needs a broken-symmetry determinant; this level has none",
            "c0_squared": "no CI vector",
        },
        notes={"start": "superposition of atomic densities, then carried along the bond"},
        inputs={"molecule": {"symbols": SYMBOLS, "charge": 0, "multiplicity": 1}, "correlation": "none"},
        reference_key="r" * 20,
        reference_stamp="s" * 16,
        stamp="t" * 16,
        provenance={"physics_version": 1, "source_digest": "d" * 12, "pyscf": "2", "host": "somewhere"}
        | {"started": "2026-01-01T00:00:00Z", "finished": "2026-01-01T00:00:01Z"},
        arrays={
            "positions": drawn.random((len(SYMBOLS), 3)),
            "dipole": drawn.random(3),
            "natural_occupations": drawn.random(ORBITALS),
            "orbital_energies": drawn.random((2, ORBITALS)),
            "mo_occ": drawn.random((2, ORBITALS)),
        },
    )


def fill(plan: Plan, store: Store) -> int:
    """Write a record for every point of the plan, without waiting for the disk; give their bytes."""
    record, written = template(), 0
    for number, point in enumerate({p.key: p for p in plan.points}.values()):
        record.key = point.key
        record.scalars["energy"] = -79.6 + 1e-6 * number
        path: Path = store.path("point", point.key)
        path.parent.mkdir(parents=True, exist_ok=True)
        written += path.write_bytes(pack(_head(record), record.arrays))
    return written


def main(scans: int, folder: Path) -> None:
    """Make, gather, tell."""
    folder.mkdir(parents=True)
    (folder / "large.yaml").write_text(planning.campaign_text(scans), encoding="utf-8")
    plan, store = make_plan(load_campaign(folder / "large.yaml")), Store(folder)
    n_bytes = fill(plan, store)
    flags = {
        (p.scan, p.level, p.number): ("single-reference", "all within their thresholds") for p in plan.points
    }
    before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    started, used = time.perf_counter(), time.process_time()
    gather(plan.points, store, folder / "campaign.h5", {"campaign": "large"}, DIAGNOSTICS, flags)
    told = {"wall": time.perf_counter() - started, "cpu": time.process_time() - used}
    added = (resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before) / 1e3
    print(
        json.dumps(
            {**told, "added_mb": added, "points": len(plan.points), "bytes": n_bytes / len(plan.points)}
        )
    )


if __name__ == "__main__":
    main(int(sys.argv[1]), Path(sys.argv[2]))
