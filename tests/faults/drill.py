"""The fault drill: one real campaign, disturbed in every way that is known, restarted as a person would.

``python tests/faults/drill.py [--only NAME ...] [--seed N] [--repeat N]`` runs 96 points (H2, HF and LiH at four
levels) once undisturbed through ``scission run``, then again with each fault in a fresh folder, starting the same
command again until it ends with 0 or 3 (then ``scission retry``).  A line a drill says:

* restarts;
* points lost: they have a result in the undisturbed run and none here;
* calculations done twice: they came to a good end more often than undisturbed.  Those that a drill damages on
  purpose do not count, nor do attempts to improve on a reference, which a resumed walk makes anew;
* whether all tables agree, energies to 1e-7 hartree.

Exit status 1 if anything is lost, done twice or different.  The full disk and the read-only folder need root, to
mount a small file system.
"""

from __future__ import annotations

import argparse
import sys
import tempfile
import time
import zlib
from dataclasses import dataclass
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parents[1]))

from drilling import compare, disks, files, processes
from drilling.campaign import Disturbed, StuckError

DRILLS = {
    "kill-worker": processes.kill_worker,
    "kill-calculation": processes.kill_child,
    "kill-engine": processes.kill_engine,
    "kill-command": processes.kill_command,
    "kill-everything": processes.kill_everything,
    "end-worker": processes.end_worker,
    "end-command": processes.end_command,
    "out-of-memory": processes.out_of_memory,
    "two-commands": processes.two_commands,
    "full-disk": disks.full_disk,
    "read-only": disks.read_only,
    "damaged-records": files.damaged_records,
    "missing-records": files.missing_records,
    "no-number": files.no_number,
    "clock-jumps": files.clock_jumps,
}


@dataclass
class Outcome:
    """What one drill came to; ``twice`` names calculations, ``differences`` cells of tables."""

    name: str
    restarts: int
    lost: list
    twice: list[str]
    differences: list[str]
    seconds: float
    remark: str

    @property
    def good(self) -> bool:
        """Whether nothing was lost, computed twice or different."""
        return not (self.lost or self.twice or self.differences)

    def line(self) -> str:
        """The outcome in one line."""
        counts = f"{self.restarts:8d} {len(self.lost):5d} {len(self.twice):6d}"
        equal = "no" if self.differences else "yes"
        return f"{self.name:17s} {counts}  {equal:6s} {self.seconds:7.0f}  {self.remark}"


def drill(name: str, folder: Path, seed: int, undisturbed: Disturbed) -> Outcome | None:
    """Run one drill in a fresh folder; None where this machine does not allow it."""
    campaign = Disturbed(folder, zlib.crc32(name.encode()) + seed)
    started = time.monotonic()
    try:
        remark, stuck = DRILLS[name](campaign), []
        if campaign.kept is None:
            campaign.settle()
            campaign.keep_tables()
    except disks.SkippedError as reason:
        print(f"{name:17s} left out: {reason}", flush=True)
        return None
    except StuckError as error:
        remark, stuck = f"STUCK: {error}", ["no good end"]
    seconds = time.monotonic() - started
    tables = campaign.kept or {}
    missing = compare.lost(tables, undisturbed.kept)
    remarks = ("notes",) if campaign.retried else ()
    unlike = stuck or compare.differences(tables, undisturbed.kept, remarks)
    outcome = Outcome(name, campaign.runs - 1, missing, twice(campaign, undisturbed), unlike, seconds, remark)
    campaign.clean()
    return outcome


def twice(campaign: Disturbed, undisturbed: Disturbed) -> list[str]:
    """Calculations with more good ends than undisturbed, those aside that were damaged on purpose."""
    once, found = undisturbed.finished(), campaign.finished()
    found = {
        what: n for what, n in found.items() if "-" not in what[0]
    }  # improving on a reference is no second one
    return [
        f"{kind} {key}"
        for (kind, key), n in found.items()
        if n > once[kind, key] and key not in campaign.expected
    ]


def main() -> int:
    """Run the drills, print the table and the verdict."""
    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("--only", nargs="+", choices=DRILLS, default=list(DRILLS), help="these drills only")
    parser.add_argument("--seed", type=int, default=1, help="decides the random moments and files")
    parser.add_argument(
        "--repeat", type=int, default=1, help="how often each drill is run, with seed, seed + 1 ..."
    )
    args = parser.parse_args()
    outcomes = []
    with tempfile.TemporaryDirectory(prefix="drill-") as home:
        undisturbed = Disturbed(Path(home) / "undisturbed")
        files.finish(undisturbed)
        undisturbed.keep_tables()
        points, ends = len(undisturbed.kept["points"]), sum(undisturbed.finished().values())
        print(f"undisturbed: {points} points, {ends} calculations")
        print("drill             restarts  lost  twice  equal  seconds  remark", flush=True)
        for seed in range(args.seed, args.seed + args.repeat):
            for name in args.only:
                outcome = drill(name, Path(home) / f"{name}-{seed}", seed, undisturbed)
                if outcome is not None:
                    print(outcome.line(), flush=True)
                    for words in [*outcome.twice, *outcome.differences][:8]:
                        print(f"  | {words}", flush=True)
                    outcomes.append(outcome)
    return verdict(outcomes)


def verdict(outcomes: list[Outcome]) -> int:
    """Print the sum of all drills; return the exit status."""
    n_lost, n_twice = (sum(len(getattr(o, name)) for o in outcomes) for name in ("lost", "twice"))
    bad = sorted({o.name for o in outcomes if not o.good})
    restarts = sum(o.restarts for o in outcomes)
    print(
        f"{len(outcomes)} drills, {restarts} restarts: {n_lost} points lost, {n_twice} calculations done twice"
    )
    print(f"FAILED: {', '.join(bad)}" if bad else "all tables equal those of the undisturbed run")
    return 1 if bad else 0


if __name__ == "__main__":
    sys.exit(main())
