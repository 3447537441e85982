"""What large campaigns cost beside their chemistry: claims, aims and measured numbers in one table.

``python tests/benchmarks/scale.py [--only check run gather parse] [--points 10000] [--scans 250]``

check   ``scission check`` of 10^5 points: wall time and peak memory of the command.
run     H2 in sto-3g, RHF and CCSD, through ``scission run`` on two cores.  Overhead of a point = (cores x wall time of
        the command - processor time of the chemistry) / points, where the chemistry is measured in the same run: the
        functions that compute records are called plainly, in one process, for the same points (a sample of whole
        scans), without guard, files and engine.  A loop that only calls the library (RHF, CCSD) is given beside it.
gather  10^5 records of real size into campaign.h5: time, and how peak memory grows with the number of scans.
parse   the Snakefile for a campaign of 100 jobs: time, and whether any chemistry was imported.

Wall times on a machine that others use as well are noisy; the processor times beside them are not.
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
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import planning

COMMAND = "import sys; from scission.cli import main; sys.exit(main())"
CORES = 2
ONE_THREAD = {"OMP_NUM_THREADS": "1"}


@dataclass(frozen=True)
class Line:
    """A row of the table."""

    claim: str
    aim: str
    measured: str


@dataclass(frozen=True)
class Cost:
    """Wall and processor time (s) and peak memory (MB) of a command and all it started."""

    wall: float
    cpu: float
    peak: float


def run(words: list[str], statuses: tuple[int, ...] = (0,)) -> Cost:
    """Run a command and measure it."""
    started, before = time.perf_counter(), resource.getrusage(resource.RUSAGE_CHILDREN)
    done = subprocess.run(words, env=os.environ | ONE_THREAD, capture_output=True, text=True, check=False)
    after, wall = resource.getrusage(resource.RUSAGE_CHILDREN), time.perf_counter() - started
    if done.returncode not in statuses:
        raise RuntimeError(f"{words}: exit status {done.returncode}: {done.stderr[-2000:]}")
    cpu = after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime
    return Cost(wall, cpu, after.ru_maxrss / 1e3)


def scission(*words: str) -> list[str]:
    """The words of a command."""
    return [sys.executable, "-c", COMMAND, *words]


def measure_check(folder: Path, args: argparse.Namespace) -> list[Line]:
    """Check a campaign of 10^5 points."""
    file = folder / "large.yaml"
    file.write_text(planning.campaign_text(args.scans), encoding="utf-8")
    cost = run(scission("check", str(file)), (0, 2))
    points = args.scans * planning.LENGTHS * len(planning.LEVELS)
    words = f"{cost.wall:.1f} s ({cost.cpu:.1f} s of processor), {cost.peak:.0f} MB"
    return [Line(f"scission check, {points} points", "20 s, 1000 MB", words)]


def measure_run(folder: Path, args: argparse.Namespace) -> list[Line]:
    """Compute tiny points through the whole program."""
    import tiny_points

    scans = max(1, args.points // tiny_points.POINTS_OF_A_SCAN)
    points = scans * tiny_points.POINTS_OF_A_SCAN
    file = folder / "tiny.yaml"
    file.write_text(tiny_points.campaign_text(scans), encoding="utf-8")
    words = scission("run", str(file), "--results", str(folder / "tiny"), "--cores", str(CORES))
    cost = run([*words, "--config", f"block_seconds={args.block_seconds}"])
    chemistry, library = tiny_points.chemistry_s(args.sample), tiny_points.library_s(args.sample)
    steps = tiny_points.steps(folder / "tiny" / "tiny")
    n = f"{points} tiny points"
    return [
        Line(f"{n}, wall time", "", f"{cost.wall:.0f} s on {CORES} cores ({cost.cpu:.0f} s of processor)"),
        Line(
            "chemistry of a point, plainly",
            "",
            f"{1e3 * chemistry:.1f} ms (library alone {1e3 * library:.1f} ms)",
        ),
        Line(
            f"{n}, overhead by wall time", "10 ms", f"{1e3 * (CORES * cost.wall / points - chemistry):.1f} ms"
        ),
        Line(f"{n}, overhead by processor", "10 ms", f"{1e3 * (cost.cpu / points - chemistry):.1f} ms"),
        Line("closing steps", "", ", ".join(f"{name} {seconds:.0f} s" for name, seconds in steps.items())),
    ]


def measure_gather(folder: Path, args: argparse.Namespace) -> list[Line]:
    """Gather made-up records, first a tenth of the scans, then all."""
    lines, peaks = [], []
    for scans in (max(1, args.scans // 10), args.scans):
        words = [sys.executable, str(Path(__file__).with_name("many_records.py"))]
        done = subprocess.run(
            [*words, str(scans), str(folder / f"many-{scans}")], capture_output=True, text=True, check=True
        )
        told = json.loads(done.stdout)
        peaks.append(told["added_mb"])
    words = f"{told['wall']:.0f} s ({told['cpu']:.0f} s of processor)"
    lines.append(Line(f"gather, {told['points']} records of {told['bytes']:.0f} bytes", "60 s", words))
    return [*lines, Line("memory it adds, a tenth / all", "flat", " / ".join(f"{p:.0f} MB" for p in peaks))]


PARSE = """
import json, sys, time
from pathlib import Path
from snakemake.api import SnakemakeApi
from snakemake.settings.types import ConfigSettings, OutputSettings, ResourceSettings
with SnakemakeApi(OutputSettings()) as api:
    flow = api.workflow(
        resource_settings=ResourceSettings(cores=1), snakefile=Path(sys.argv[1]), workdir=Path(sys.argv[3]),
        config_settings=ConfigSettings(configfiles=[Path(sys.argv[2])], config={"results": sys.argv[3]}))
    before = set(sys.modules)
    started, used = time.perf_counter(), time.process_time()
    flow._workflow  # reads the Snakefile and what it includes
    wall, cpu = time.perf_counter() - started, time.process_time() - used
loaded = [name for name in ("pyscf", "scipy", "h5py", "pandas") if name in set(sys.modules) - before]
print(json.dumps({"wall": wall, "cpu": cpu, "loaded": loaded}))
"""


def measure_parse(folder: Path, args: argparse.Namespace) -> list[Line]:  # noqa: ARG001
    """Parse the Snakefile as every job on a cluster does."""
    from scission.execution import planning as plans
    from scission.execution.layout import PROJECT

    file, results = folder / "parse.yaml", folder / "parse"
    file.write_text(planning.campaign_text(1), encoding="utf-8")
    _, index = plans.refresh(plans.read_config(file), file, results, {})
    words = [sys.executable, "-c", PARSE, str(PROJECT / "Snakefile"), str(file), str(results)]
    done = subprocess.run(words, capture_output=True, text=True, check=False)
    if done.returncode:
        raise RuntimeError(done.stderr[-2000:])
    told = json.loads(done.stdout.splitlines()[-1])
    seconds = f"{told['wall']:.2f} s ({told['cpu']:.2f} s of processor)"
    loaded = ", ".join(told["loaded"]) or "none"
    return [
        Line(f"Snakefile parsed, {len(index['jobs'])} jobs", "1 s", seconds),
        Line("of chemistry, numerics, tables it loads", "none", loaded),
    ]


MEASURES: dict[str, Callable[[Path, argparse.Namespace], list[Line]]] = {
    "check": measure_check,
    "run": measure_run,
    "gather": measure_gather,
    "parse": measure_parse,
}


def main() -> None:
    """Measure, and print the table."""
    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("--only", nargs="+", choices=MEASURES, default=list(MEASURES), help="these only")
    parser.add_argument("--points", type=int, default=10_000, help="tiny points that are really computed")
    parser.add_argument("--sample", type=int, default=5, help="scans of tiny points computed plainly")
    parser.add_argument("--scans", type=int, default=250, help="scans of 400 points for check and gather")
    parser.add_argument("--block-seconds", type=float, default=60.0, help="work in one job of the run")
    args = parser.parse_args()
    print(f"{'claim':40s}  {'aim':14s}  measured", flush=True)
    for name in args.only:
        with tempfile.TemporaryDirectory(prefix="scale-") as folder:
            for line in MEASURES[name](Path(folder), args):
                print(f"{line.claim:40s}  {line.aim:14s}  {line.measured}", flush=True)


if __name__ == "__main__":
    main()
