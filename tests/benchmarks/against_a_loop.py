"""A campaign against the loop that a chemist would write: same geometries, same levels, one machine.

Run by hand on a quiet machine (an hour and a half with all points; ``--points 12`` for a look):

    .venv/bin/python tests/benchmarks/against_a_loop.py --cases water nitrogen ethane

For every case it takes the wall time of the loop in one process pinned to one thread, of the same loop with the
engine's default threads, and of ``scission run`` from the command to the tables, all on the same machine in the
same run, and compares the energies.  The loop computes energies and nothing else; the campaign also looks for
instabilities, computes its diagnostics and the separate fragments, fits, and draws.
"""

from __future__ import annotations

import argparse
import json
import os
import resource
import subprocess
import sys
import tempfile
import time
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import yaml

SAME = 1e-6
"""Energies this close (hartree) are the same result."""

N2 = "N 0 0 0\nN 0 0 1.0977"
WATER = "O 0 0 0.1173\nH 0 0.7572 -0.4692\nH 0 -0.7572 -0.4692"
ETHANE = (
    "C 0 0 0\nC 0 0 1.53\nH 1.02 0 -0.39\nH -0.51 0.883 -0.39\nH -0.51 -0.883 -0.39\n"
    "H -1.02 0 1.92\nH 0.51 0.883 1.92\nH 0.51 -0.883 1.92"
)

CASES: dict[str, dict[str, Any]] = {
    "water": {
        "atoms": WATER,
        "bond": ["O1", "H2"],
        "lengths": (0.75, 2.2),
        "levels": {"cc": {"reference": "RHF", "correlation": "CCSD(T)", "basis": "cc-pVTZ"}},
    },
    "nitrogen": {
        "atoms": N2,
        "bond": ["N1", "N2"],
        "lengths": (0.85, 3.0),
        "levels": {
            "pt": {
                "reference": "CASSCF",
                "active_space": {"electrons": 6, "orbitals": 6},
                "correlation": "NEVPT2",
                "basis": "cc-pVTZ",
            }
        },
    },
    "ethane": {
        "atoms": ETHANE,
        "bond": ["C1", "C2"],
        "lengths": (1.2, 3.0),
        "levels": {
            "ks": {"reference": "UKS", "functional": "B3LYP", "basis": "6-31g*"},
            "cc": {"reference": "RHF", "correlation": "CCSD(T)", "basis": "6-31g*"},
        },
    },
}


@dataclass
class Timed:
    """What one way took: wall and processor seconds, and its energies by level (hartree, NaN: none)."""

    wall_s: float
    cpu_s: float
    energies: dict[str, list[float]]


def write_campaign(case: str, points: int, folder: Path) -> Path:
    """Write the campaign file of a case and return its path."""
    facts = CASES[case]
    first, last = facts["lengths"]
    campaign = {
        "campaign": case,
        "molecules": {"m": {"charge": 0, "multiplicity": 1, "atoms": facts["atoms"]}},
        "levels": facts["levels"],
        "scans": {
            "s": {
                "molecule": "m",
                "levels": list(facts["levels"]),
                "stretch": {
                    "bond": facts["bond"],
                    "lengths": {"from": first, "to": last, "points": points, "spacing": "even"},
                },
            }
        },
    }
    path = folder / f"{case}.yaml"
    path.write_text(yaml.safe_dump(campaign))
    return path


def run_campaign(case: str, path: Path, folder: Path) -> Timed:
    """Run the campaign through the command; return what it took to its tables."""
    before, start = _children_cpu(), time.monotonic()
    command = [str(Path(sys.executable).parent / "scission"), "run", str(path), "--results", str(folder)]
    status = subprocess.run(command, stdout=subprocess.DEVNULL, check=False).returncode
    wall, cpu = time.monotonic() - start, _children_cpu() - before
    if status not in (0, 3):
        raise SystemExit(f"the campaign ended with status {status}; see {folder}")
    table = pd.read_csv(folder / case / "tables" / "points.csv")
    groups = table.sort_values("point").groupby("level")["energy_hartree"]
    return Timed(wall, cpu, {str(level): list(energies) for level, energies in groups})


def kernel_seconds(case: str, folder: Path) -> float:
    """Return the processor seconds inside calculations, as the records have them."""
    from scission.records.store import Store

    store, total = Store(folder / case), 0.0
    for kind in ("reference", "point", "fragment"):
        for key in store.keys(kind):
            record = store.read(kind, key, arrays=False)
            shared = record is None or (kind == "point" and record.stage == "reference")
            total += 0.0 if shared else float(record.scalars.get("cpu_s", 0.0))
    return total


def run_loop(case: str, path: Path, threads: str) -> Timed:
    """Run the loop in a process of its own with so many threads ("" for the default)."""
    environment = {k: v for k, v in os.environ.items() if k != "OMP_NUM_THREADS"}
    environment |= {"OMP_NUM_THREADS": threads} if threads else {}
    before, start = _children_cpu(), time.monotonic()
    command = [sys.executable, __file__, "--loop", case, str(path)]
    answer = subprocess.run(command, env=environment, capture_output=True, text=True, check=True).stdout
    return Timed(time.monotonic() - start, _children_cpu() - before, json.loads(answer.splitlines()[-1]))


def loop(case: str, path: Path) -> dict[str, list[float]]:
    """Compute every geometry by itself, level after level, as a plain script does."""
    from pyscf import gto
    from scission.campaign import load_campaign
    from scission.plan import make_plan

    plan = make_plan(load_campaign(path))
    positions = {
        node["coordinate"]: node["positions"]
        for job in plan.jobs
        for chain in job.payload.get("chains", [])
        for node in chain["nodes"]
    }
    energies: dict[str, list[float]] = {level: [] for level in CASES[case]["levels"]}
    symbols = [line.split()[0] for line in CASES[case]["atoms"].splitlines()]
    for length in sorted({point.coordinate[0] for point in plan.points}):
        atoms = list(zip(symbols, positions[length], strict=True))
        for name, level in CASES[case]["levels"].items():
            mole = gto.M(atom=atoms, unit="Bohr", basis=level["basis"], verbose=0)
            energies[name].append(_energy(mole, level))
    return energies


def _energy(mole: Any, level: dict[str, Any]) -> float:
    from pyscf import cc, dft, mcscf, mrpt, scf

    if level["reference"] == "UKS":
        field = dft.UKS(mole, xc=level["functional"]).run(conv_tol=1e-10)
        return float(field.e_tot) if field.converged else float("nan")
    field = scf.RHF(mole).run(conv_tol=1e-10)
    if level["reference"] == "CASSCF":
        space = level["active_space"]
        mc = mcscf.CASSCF(field, space["orbitals"], space["electrons"]).run(conv_tol=1e-9)
        return float(mc.e_tot + mrpt.NEVPT(mc).kernel()) if mc.converged else float("nan")
    solver = cc.CCSD(field, frozen=_frozen(mole))
    solver.conv_tol, solver.conv_tol_normt, solver.max_cycle = 1e-9, 1e-7, 100
    solver.run()
    return float(solver.e_tot + solver.ccsd_t()) if solver.converged else float("nan")


def _frozen(mole: Any) -> int | None:
    from pyscf.data.elements import chemcore

    return chemcore(mole) or None


def _children_cpu() -> float:
    used = resource.getrusage(resource.RUSAGE_CHILDREN)
    return used.ru_utime + used.ru_stime


def compare(case: str, points: int, with_default: bool) -> str:
    """Return what there is to say about one case."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        path = write_campaign(case, points, folder)
        ours = run_campaign(case, path, folder / "results")
        kernel = kernel_seconds(case, folder / "results")
        pinned = run_loop(case, path, "1")
        default = run_loop(case, path, "") if with_default else None
    cores = len(os.sched_getaffinity(0))
    lines = [
        f"{case}: {points} points",
        f"  loop, one thread   {pinned.wall_s:8.1f} s wall {pinned.cpu_s:8.1f} s cpu",
        f"  campaign           {ours.wall_s:8.1f} s wall {ours.cpu_s:8.1f} s cpu: "
        f"{pinned.wall_s / ours.wall_s:.2f} times faster; "
        f"inside calculations {kernel / (cores * ours.wall_s):.2f} of {cores} cores x wall",
    ]
    if default is not None:
        words = f"campaign {default.wall_s / ours.wall_s:.2f} times faster"
        lines.insert(
            2, f"  loop, all threads  {default.wall_s:8.1f} s wall {default.cpu_s:8.1f} s cpu: {words}"
        )
    return "\n".join([*lines, *_agreement(ours, pinned)])


def _agreement(ours: Timed, plain: Timed) -> list[str]:
    lines = []
    for level, energies in plain.energies.items():
        step = np.array(ours.energies[level]) - np.array(energies)
        same, lower, higher = np.abs(step) < SAME, step <= -SAME, step >= SAME
        lines.append(
            f"  {level}: {same.sum()} energies the same to {SAME:g} hartree (largest difference "
            f"{np.abs(step[same]).max(initial=0.0):.1e}), campaign lower at {lower.sum()}, higher at "
            f"{higher.sum()}; without a result: loop {np.isnan(energies).sum()}, "
            f"campaign {np.isnan(ours.energies[level]).sum()}"
        )
    return lines


def main() -> None:
    """Print the comparison, or be the loop."""
    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("--cases", nargs="+", default=list(CASES), choices=list(CASES))
    parser.add_argument("--points", type=int, default=60)
    parser.add_argument("--without-default", action="store_true", help="leave out the loop with all threads")
    parser.add_argument("--loop", nargs=2, metavar=("CASE", "CAMPAIGN"), help="be the loop itself")
    arguments = parser.parse_args()
    if arguments.loop:
        print(json.dumps(loop(arguments.loop[0], Path(arguments.loop[1]))))
        return
    for case in arguments.cases:
        print(compare(case, arguments.points, not arguments.without_default), flush=True)


if __name__ == "__main__":
    main()
