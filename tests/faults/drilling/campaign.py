"""The campaign that is disturbed, and how a person would go on with it."""

import os
import random
import shutil
import subprocess
import time
from collections import Counter
from pathlib import Path

import psutil
from scission.execution import drills
from scission.execution.layout import read_json
from small_campaign import Campaign

from drilling import compare

TEXT = """
campaign: drill
molecules:
  h2: {charge: 0, multiplicity: 1, atoms: "H 0 0 0\\nH 0 0 0.74"}
  hf: {charge: 0, multiplicity: 1, atoms: "H 0 0 0\\nF 0 0 0.92"}
  lih: {charge: 0, multiplicity: 1, atoms: "Li 0 0 0\\nH 0 0 1.6"}
levels:
  rhf: {reference: RHF, basis: sto-3g}
  uhf: {reference: UHF, basis: sto-3g}
  cct: {reference: RHF, correlation: CCSD(T), basis: sto-3g}
  cas: {reference: CASSCF, active_space: {electrons: 2, orbitals: 2}, basis: sto-3g}
scans:
  h-h:
    molecule: h2
    levels: [rhf, uhf, cct, cas]
    stretch: {bond: [H1, H2], lengths: [0.5, 0.65, 0.74, 0.9, 1.2, 1.6, 2.2, 3.0]}
  h-f:
    molecule: hf
    levels: [rhf, uhf, cct, cas]
    stretch: {bond: [H1, F2], lengths: [0.75, 0.85, 0.92, 1.05, 1.3, 1.7, 2.3, 3.0]}
  li-h:
    molecule: lih
    levels: [rhf, uhf, cct, cas]
    stretch: {bond: [Li1, H2], lengths: [1.2, 1.4, 1.6, 1.9, 2.3, 2.8, 3.5, 4.5]}
"""
SETTINGS = ("--config", "block_seconds=2")
GOOD, POINTS_FAILED = 0, 3
MOST_RUNS = 6
LIMIT_S = 400.0


class StuckError(Exception):
    """A campaign that does not come to its end; the text says how it was left."""


class Disturbed(Campaign):
    """The campaign in a folder of its own, with the journal of what was computed."""

    def __init__(self, folder: Path, seed: int = 0) -> None:
        folder.mkdir(parents=True)
        super().__init__(folder, TEXT, SETTINGS)
        self.journal = folder / "journal.txt"
        self.random = random.Random(seed)
        self.runs = 0
        self.retried = False
        """Whether points were computed with a remedy, which their remarks then tell."""
        self.status = None
        """Exit status of the latest run that came to its end."""
        self.told: list[str] = []
        self.expected: set[str] = set()
        """Keys that this drill makes the program compute again on purpose."""
        self.kept = None
        """The final tables, once they are there."""

    def environment(self, drill=None, **more):
        """As for every small campaign, with a journal."""
        return super().environment(drill, **{drills.JOURNAL: str(self.journal)}, **more)

    def run(self, *words, drill=None, timeout=LIMIT_S):
        """Run the command as a person does; remember what it said."""
        self.runs += 1
        done = super().run(*words, drill=drill, timeout=timeout)
        self.told.append(done.stderr)
        return done

    def start(self, drill=None):
        """Start the command without waiting."""
        self.runs += 1
        with (self.file.parent / f"stderr-{self.runs}.txt").open("w") as out:
            return subprocess.Popen(self.run_command(), env=self.environment(drill), stdout=out, stderr=out)

    def settle(self):
        """Start the same command until it ends well; retry what it lists as failed; give its last status.

        Raises:
            StuckError: it does not end well.
        """
        for _ in range(MOST_RUNS):
            if self.status == GOOD:
                return
            try:
                done = self.run()
            except subprocess.TimeoutExpired:
                raise StuckError(f"not done after {LIMIT_S:g} s") from None
            if done.returncode == POINTS_FAILED:
                self.runs, self.retried = self.runs + 1, True
                done = self.retry()
            self.status = done.returncode
        if self.status != GOOD:
            raise StuckError(f"exit status {self.status} after {self.runs} runs: {done.stderr[-300:]}")

    def keep_tables(self):
        """Read the final tables, before their folder may go away."""
        self.kept = compare.tables(self.layout.folder)

    def lines(self):
        """The journal: kind, key, attempt and status of every start and end."""
        return (
            [line.split() for line in self.journal.read_text().splitlines()] if self.journal.exists() else []
        )

    def finished(self):
        """How often each kind of calculation of a key came to a good end."""
        return Counter((kind, key) for kind, key, _, status in self.lines() if status == "converged")

    def wait_for_starts(self, count, process):
        """Wait until so many calculations were started, or the command has ended."""
        while process.poll() is None and sum(line[3] == "start" for line in self.lines()) < count:
            time.sleep(0.05)

    def engine(self):
        """The engine's process, None if there is none."""
        return _process((read_json(self.layout.run_file) or {}).get("engine", {}).get("pid"))

    def workers(self):
        """The processes of the workers that calculate at present."""
        markers = (read_json(p) or {} for p in self.layout.running("x").parent.glob("[!.]*.json"))
        return [p for p in {_process(marker.get("pid")) for marker in markers} if p is not None]

    def clean(self):
        """Remove everything, and end what is left of this campaign's processes."""
        for process in [p for p in (self.engine(), *self.workers()) if p is not None]:
            process.kill()
        shutil.rmtree(self.file.parent, ignore_errors=True)


def _process(pid):
    try:
        process = psutil.Process(pid) if pid and pid != os.getpid() else None
        return process if process and process.status() != psutil.STATUS_ZOMBIE else None
    except psutil.NoSuchProcess:
        return None
