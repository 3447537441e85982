"""How many points of a scan lie on the right state: carried references against independent points.

Run by hand (hours on all scans, minutes on one):

    .venv/bin/python tests/benchmarks/continuity.py --scans H2 HF N2 --levels rhf uhf cas ccsd

For every scan and level it prints, for independent points from the engine's default guess and for the walk of
this program, in the same run: points unconverged / above the best known / jumps between neighbours that were
not reported as crossings, and processor seconds.  "Best known" is the lowest energy of either route at that
length; for restricted references, which follow a state on purpose, and for coupled cluster, which is not
variational, points above it are shown in brackets and are no error by themselves; so are active spaces that
lie above another one, of the same size but of other orbitals.
"""

from __future__ import annotations

import argparse
import os
import tempfile
import time
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

os.environ.setdefault("OMP_NUM_THREADS", "1")

import numpy as np
import yaml
from pyscf import cc, mcscf
from scission.campaign import load_campaign
from scission.chemistry import integrals, scf
from scission.chemistry.molecule import build_mole, root_overlap
from scission.chemistry.orbitals import Orbitals, state_overlap_any_spin, subspace_overlap
from scission.chemistry.tasks import run_task
from scission.chemistry.walk import walk_chain
from scission.plan import Plan, make_plan
from scission.records.store import Store

LOWER = 1e-6
GRID_ROOM = 1e-5
"""Kohn-Sham energies of one state turned about the bond differ by so much on the default grid, hartree."""
SMOOTH = 0.9
POINTS = 25

SCANS: dict[str, tuple[str, list[str], float, int]] = {
    "H2": ("H 0 0 0\nH 0 0 0.7414", ["H1", "H2"], 0.7414, 1),
    "LiH": ("Li 0 0 0\nH 0 0 1.5957", ["Li1", "H2"], 1.5957, 1),
    "F2": ("F 0 0 0\nF 0 0 1.4119", ["F1", "F2"], 1.4119, 1),
    "N2": ("N 0 0 0\nN 0 0 1.0977", ["N1", "N2"], 1.0977, 1),
    "HF": ("F 0 0 0\nH 0 0 0.9168", ["F1", "H2"], 0.9168, 1),
    "water": ("O 0 0 0.1173\nH 0 0.7572 -0.4692\nH 0 -0.7572 -0.4692", ["O1", "H2"], 0.9578, 1),
    "ethane": (
        "C 0 0 0\nC 0 0 1.53\nH 1.02 0 -0.39\nH -0.51 0.883 -0.39\nH -0.51 -0.883 -0.39\n"
        "H -1.02 0 1.92\nH 0.51 0.883 1.92\nH 0.51 -0.883 1.92",
        ["C1", "C2"],
        1.53,
        1,
    ),
    "methanol": (
        "C 0 0 0\nO 0 0 1.42\nH 1.02 0 -0.39\nH -0.51 0.883 -0.39\nH -0.51 -0.883 -0.39\nH -0.9 0 1.74",
        ["C1", "O2"],
        1.42,
        1,
    ),
    "ethylene": (
        "C 0 0 0\nC 0 0 1.33\nH 0.923 0 -0.56\nH -0.923 0 -0.56\nH 0.923 0 1.89\nH -0.923 0 1.89",
        ["C1", "C2"],
        1.33,
        1,
    ),
    "LiF": ("Li 0 0 0\nF 0 0 1.5639", ["Li1", "F2"], 1.5639, 1),
    "OH": ("O 0 0 0\nH 0 0 0.9697", ["O1", "H2"], 0.9697, 2),
    "CN": ("C 0 0 0\nN 0 0 1.1718", ["C1", "N2"], 1.1718, 2),
    "CO": ("C 0 0 0\nO 0 0 1.1283", ["C1", "O2"], 1.1283, 1),
    "C2": ("C 0 0 0\nC 0 0 1.2425", ["C1", "C2"], 1.2425, 1),
    "Cl2": ("Cl 0 0 0\nCl 0 0 1.9879", ["Cl1", "Cl2"], 1.9879, 1),
    "BH": ("B 0 0 0\nH 0 0 1.2324", ["B1", "H2"], 1.2324, 1),
}

LEVELS: dict[str, dict[str, Any]] = {
    "rhf": {"reference": "RHF"},
    "uhf": {"reference": "UHF"},
    "uks": {"reference": "UKS", "functional": "B3LYP"},
    "cas": {"reference": "CASSCF", "active_space": "auto"},
    "ccsd": {"reference": "RHF", "correlation": "CCSD"},
    "uccsd": {"reference": "UHF", "correlation": "CCSD"},
}


@dataclass
class Curve:
    """What one route gave: energies (NaN where unconverged), unreported jumps, processor seconds.

    ``diagnosing`` is the part of them that went into diagnostics, which independent points do not have.
    """

    energies: list[float] = field(default_factory=list)
    spaces: list[Any] = field(default_factory=list)
    jumps: int = 0
    wrong_spin: int = 0
    seconds: float = 0.0
    diagnosing: float = 0.0


def plan_of(scan: str, level: str, basis: str, folder: Path) -> Plan:
    """Return the plan of one scan at one level."""
    atoms, bond, equilibrium, multiplicity = SCANS[scan]
    campaign = {
        "campaign": "continuity",
        "molecules": {"m": {"charge": 0, "multiplicity": multiplicity, "atoms": atoms}},
        "levels": {level: {**LEVELS[level], "basis": basis}},
        "scans": {
            "s": {
                "molecule": "m",
                "levels": [level],
                "stretch": {
                    "bond": bond,
                    "lengths": {"from": 0.7 * equilibrium, "to": 10.0, "points": POINTS, "spacing": "graded"},
                },
            }
        },
    }
    path = folder / "campaign.yaml"
    path.write_text(yaml.safe_dump(campaign))
    return make_plan(load_campaign(path))


def carried(plan: Plan, folder: Path) -> tuple[Curve, list[dict[str, Any]]]:
    """Walk the chains and compute the points; return the curve and the crossings that were reported."""
    store, curve, crossings = Store(folder / "results"), Curve(), []
    start = time.process_time()
    for job in plan.jobs:
        for chain in job.payload.get("chains", []):
            said = walk_chain(chain, store, lambda task: _timed(task, store, curve))
            crossings += said["crossings"]
    for job in plan.jobs:
        for item in job.payload["points"] if job.stage == "correlate" else []:
            run_task(item, store)
    curve.seconds = time.process_time() - start
    correlated = any(job.stage == "correlate" for job in plan.jobs)
    for point in plan.points:
        record = (
            store.read("point", point.key) if correlated else store.read("reference", point.reference_key)
        )
        good = record is not None and record.status == "converged"
        curve.energies.append(
            float(record.scalars["energy"]) if record is not None and good else float("nan")
        )
        curve.wrong_spin += int(record is not None and record.reason == "spin")
        curve.spaces.append(_active_space(record))
    curve.jumps = _unreported(plan, store, crossings)
    return curve, crossings


def _active_space(record: Any) -> Any:
    if record is None or "active" not in record.arrays:
        return None
    n_core, n_active = (int(n) for n in record.arrays["active"][:2])
    return record.arrays["mo_lowdin"][0][:, n_core : n_core + n_active]


def _timed(task: dict[str, Any], store: Store, curve: Curve) -> dict[str, Any]:
    start = time.process_time()
    answer = run_task(task, store)
    if task["kind"] in ("finish", "coulson_fischer"):
        curve.diagnosing += time.process_time() - start
    return answer


def _unreported(plan: Plan, store: Store, crossings: list[dict[str, Any]]) -> int:
    from scission.chemistry.compare import likeness

    reported = {(c["from_key"], c["to_key"]) for c in crossings}
    records = [store.read("reference", p.reference_key) for p in plan.points]
    pairs = zip(plan.points, plan.points[1:], records, records[1:], strict=False)
    return sum(
        likeness(a, b) < SMOOTH and (p.reference_key, q.reference_key) not in reported
        for p, q, a, b in pairs
        if a is not None and b is not None and a.status == b.status == "converged"
    )


def independent(plan: Plan) -> Curve:
    """Compute every point by itself from the engine's default guess, as a plain loop would."""
    chain = next(c for job in plan.jobs for c in job.payload.get("chains", []))
    correlated = any(job.stage == "correlate" for job in plan.jobs)
    curve, last = Curve(), None
    start = time.process_time()
    for node in chain["nodes"]:
        if node["auxiliary"]:
            continue
        energy, here, compare, spin_is_right = _single(chain, np.array(node["positions"]), correlated)
        curve.energies.append(energy)
        curve.spaces.append(here)
        curve.wrong_spin += not spin_is_right
        if last is not None and np.isfinite(energy):
            curve.jumps += compare(last, here) < SMOOTH
        last = here if np.isfinite(energy) else last
    curve.seconds = time.process_time() - start
    return curve


def _single(
    chain: dict[str, Any], positions: np.ndarray, correlated: bool
) -> tuple[float, Any, Callable[[Any, Any], float], bool]:
    integrals.forget()  # a plain loop has none of the walk's
    mole = build_mole(chain["molecule"], chain["spec"]["basis"], positions)
    root, _ = root_overlap(mole)
    mean = scf.build_field(mole, chain["spec"])
    mean.kernel()
    if chain["spec"]["reference"] == "CASSCF":
        return _single_active(mole, mean, root)
    here = scf.orbitals_of(mean).transformed(root)
    if not correlated:
        return (float(mean.e_tot) if mean.converged else float("nan")), here, _determinants, True
    solver = cc.CCSD(mean, frozen=_frozen(mole))
    try:
        solver.kernel()
        good = bool(solver.converged and mean.converged)
    except (AttributeError, np.linalg.LinAlgError):
        good = False
    return (float(solver.e_tot) if good else float("nan")), here, _determinants, True


def _single_active(mole: Any, mean: Any, root: np.ndarray) -> tuple[Any, ...]:
    n_core, n_active, n_electrons = _sizes
    mc = mcscf.CASSCF(mean, n_active, n_electrons)
    mc.kernel()
    here = root @ mc.mo_coeff[:, n_core : n_core + n_active]
    s = mole.spin / 2.0
    right = abs(mc.fcisolver.spin_square(mc.ci, n_active, mc.nelecas)[0] - s * (s + 1)) < 1e-3
    return (float(mc.e_tot) if mc.converged else float("nan")), here, subspace_overlap, right


def _determinants(a: Orbitals, b: Orbitals) -> float:
    return state_overlap_any_spin(a, b)[0]


def _frozen(mole: Any) -> int | None:
    from pyscf.data.elements import chemcore

    return chemcore(mole) or None


_sizes: tuple[int, int, int] = (0, 0, 0)


def compare(scan: str, level: str, basis: str) -> str:
    """Return one line of the table."""
    global _sizes
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        plan = plan_of(scan, level, basis, folder)
        ours, crossings = carried(plan, folder)
        if level == "cas":
            store = Store(folder / "results")
            first = next(
                r
                for p in plan.points
                if (r := store.read("reference", p.reference_key)) and "active" in r.arrays
            )
            _sizes = tuple(int(n) for n in first.arrays["active"])  # type: ignore[assignment]
        plain = independent(plan)
    room = GRID_ROOM if level == "uks" else LOWER
    best = np.fmin(np.array(ours.energies), np.array(plain.energies))
    cells = [f"{scan:9s} {level:6s}"]
    for curve in (plain, ours):
        energies = np.array(curve.energies)
        lost = int(np.sum(~np.isfinite(energies)))
        above = int(np.sum(energies > best + room))
        spin = f" spin {curve.wrong_spin}" if curve.wrong_spin else ""
        shown = f"({above})" if level in ("rhf", "ccsd", "uccsd") else str(above)
        if level == "cas":
            alike = [subspace_overlap(a, b) > SMOOTH for a, b in zip(ours.spaces, plain.spaces, strict=True)]
            higher = energies > best + room
            shown = f"{np.sum(higher & np.array(alike))}({np.sum(higher & ~np.array(alike))})"
        cells.append(f"{lost}/{shown}/{curve.jumps}{spin}  {curve.seconds:7.1f} s")
    walk = ours.seconds - ours.diagnosing
    ratios = f"{walk / plain.seconds:.2f}, with diagnostics {ours.seconds / plain.seconds:.2f}"
    cells.append(f"crossings {len(crossings)}  ratio {ratios}")
    return "   ".join(cells)


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("--scans", nargs="+", default=list(SCANS), choices=list(SCANS))
    parser.add_argument("--levels", nargs="+", default=list(LEVELS), choices=list(LEVELS))
    parser.add_argument("--basis", default="6-31g*")
    arguments = parser.parse_args()
    print("scan      level    independent points            this program's walk")
    for scan in arguments.scans:
        for level in arguments.levels:
            print(compare(scan, level, arguments.basis), flush=True)


if __name__ == "__main__":
    main()
