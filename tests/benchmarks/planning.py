"""How long a campaign of 10^5 points takes to check and to plan, and what memory that needs.

``python tests/benchmarks/planning.py [--scans 250] [--profile]`` writes the campaign to a temporary
folder, reads, expands and forecasts it in this process, and prints seconds and peak memory.
"""

from __future__ import annotations

import argparse
import cProfile
import pstats
import resource
import tempfile
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

LENGTHS = 50
LEVELS = {
    "hf": "{reference: RHF, basis: cc-pVDZ}",
    "mp2": "{reference: RHF, correlation: MP2, basis: cc-pVDZ}",
    "cc": "{reference: RHF, correlation: CCSD(T), basis: cc-pVDZ}",
    "uhf": "{reference: UHF, basis: cc-pVDZ}",
    "ucc": "{reference: UHF, correlation: CCSD, basis: cc-pVDZ}",
    "dft": "{reference: UKS, functional: PBE0, basis: def2-SVP}",
    "cas": "{reference: CASSCF, active_space: auto, basis: cc-pVDZ}",
    "pt": "{reference: CASSCF, active_space: auto, correlation: NEVPT2, basis: cc-pVDZ}",
}
ETHANE = """C 0 0 {z:.4f}
      C 0 0 -0.765
      H 1.0217 0 {up:.4f}
      H -0.5108 0.8848 {up:.4f}
      H -0.5108 -0.8848 {up:.4f}
      H -1.0217 0 -1.1575
      H 0.5108 -0.8848 -1.1575
      H 0.5108 0.8848 -1.1575
"""


def campaign_text(scans: int) -> str:
    """A campaign of that many scans, each of another molecule, at all levels."""
    lines = ["campaign: large", "levels:", *(f"  {name}: {level}" for name, level in LEVELS.items())]
    lines.append("molecules:")
    for i in range(scans):
        z = 0.765 + 1e-4 * i
        atoms = ETHANE.format(z=z, up=z + 0.3925)
        lines.append(f"  m{i}:\n    charge: 0\n    multiplicity: 1\n    atoms: |\n      {atoms}".rstrip())
    lines.append("scans:")
    grid = f"{{from: 0.9, to: 10.0, points: {LENGTHS}, spacing: graded}}"
    for i in range(scans):
        stretch = f"{{bond: [C1, C2], lengths: {grid}}}"
        lines.append(f"  s{i}: {{molecule: m{i}, levels: [{', '.join(LEVELS)}], stretch: {stretch}}}")
    return "\n".join(lines) + "\n"


def timed(what: str, call: Callable[[], Any]) -> Any:
    """Call, and print what it took."""
    started, used = time.perf_counter(), time.process_time()
    result = call()
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1e3
    wall, cpu = time.perf_counter() - started, time.process_time() - used
    print(f"{what:10s} {wall:6.1f} s ({cpu:.1f} s of processor)   peak so far {peak:6.0f} MB", flush=True)
    return result


def measure(scans: int) -> None:
    """Read, expand and forecast one campaign."""
    from scission.campaign import load_campaign
    from scission.forecast import estimate
    from scission.plan import make_plan

    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "large.yaml"
        path.write_text(campaign_text(scans), encoding="utf-8")
        campaign = timed("read", lambda: load_campaign(path))
        plan = timed("plan", lambda: make_plan(campaign))
        forecast = timed("forecast", lambda: estimate(plan))
        timed("finish", lambda: forecast.finish_s(200))
    print(f"{len(plan.points)} points, {len(plan.jobs)} jobs, {forecast.total.core_s / 3600:.0f} core hours")


def main() -> None:
    """Measure, under the profiler if asked."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--scans", type=int, default=250, help="scans of 50 lengths at 8 levels")
    parser.add_argument("--profile", action="store_true", help="show where the time goes")
    args = parser.parse_args()
    if not args.profile:
        measure(args.scans)
        return
    with cProfile.Profile() as profile:
        measure(args.scans)
    pstats.Stats(profile).sort_stats("tottime").print_stats(25)


if __name__ == "__main__":
    main()
