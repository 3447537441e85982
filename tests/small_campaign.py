"""A real small campaign, run as a person runs it."""

import csv
import json
import os
import subprocess
import sys
from pathlib import Path

from scission.execution import planning
from scission.execution.layout import Layout

H2 = """
campaign: h2-small
molecules:
  h2: {charge: 0, multiplicity: 1, atoms: "H 0 0 0\\nH 0 0 0.74"}
levels:
  hf: {reference: RHF, correlation: none, basis: sto-3g}
  cc: {reference: RHF, correlation: CCSD, basis: sto-3g}
scans:
  bond:
    molecule: h2
    levels: [hf, cc]
    stretch: {bond: [H1, H2], lengths: [0.6, 0.7, 0.75, 0.9, 1.2, 2.0]}
"""
COSTS = ("wall_s", "cpu_s", "peak_memory_mb")
"""Columns that differ from run to run on any machine."""


class Campaign:
    """A campaign file in a folder of its own, and the commands on it."""

    def __init__(self, folder: Path, text: str = H2, settings: tuple[str, ...] = ()) -> None:
        self.file = folder / "campaign.yaml"
        self.file.write_text(text)
        self.results = folder / "results"
        self.layout = Layout(self.results / planning.read_config(self.file)["campaign"])
        self.settings = settings

    def command(self, *words):
        """The words of a ``scission`` command with this campaign's results folder."""
        return [sys.executable, "-c", "import sys; from scission.cli import main; sys.exit(main())", *words]

    def run_command(self, *words):
        """The words of ``scission run`` for this campaign."""
        place = ("--results", str(self.results), "--cores", "2")
        return self.command("run", str(self.file), *place, *words, *self.settings)

    def environment(self, drill=None, **more):
        """One thread a process; the drill makes the calculations of some keys misbehave."""
        inside = {"OMP_NUM_THREADS": "1", **more}
        return os.environ | inside | ({"SCISSION_DRILL": json.dumps(drill)} if drill else {})

    def run(self, *words, drill=None, timeout=240):
        """Run ``scission run``; give the finished process."""
        return self.finish(self.run_command(*words), drill, timeout)

    def retry(self, *words):
        """Run ``scission retry`` on this campaign's own list."""
        return self.finish(self.command("retry", str(self.layout.failures), "--cores", "2", *words))

    def start(self, drill=None):
        """Start ``scission run`` without waiting for it."""
        words = self.run_command()
        return subprocess.Popen(words, env=self.environment(drill), stderr=subprocess.PIPE, text=True)

    def finish(self, words, drill=None, timeout=240):
        """Run a command to its end."""
        return subprocess.run(
            words, env=self.environment(drill), capture_output=True, text=True, timeout=timeout, check=False
        )

    def plan(self):
        """Make the plan as a run would, to learn the keys."""
        config = planning.read_config(self.file)
        return planning.refresh(config, self.file, self.results, {})[1]

    def key(self, level, point, which="key"):
        """The key of a point, or of its reference."""
        self.plan()
        rows = planning.read_points(self.layout)
        return next(r[which] for r in rows if (r["level"], r["point"]) == (level, str(point)))

    def rows(self, table="tables/points.csv", without=()):
        """The rows of a table, without some of its columns."""
        with (self.layout.folder / table).open(newline="") as handle:
            return [{k: v for k, v in r.items() if k not in without} for r in csv.DictReader(handle)]

    def changed(self):
        """When each record and summary of a job was written."""
        names = ("records", "references", "jobs")
        return {p: p.stat().st_mtime_ns for n in names for p in (self.layout.folder / n).rglob("*.*")}
