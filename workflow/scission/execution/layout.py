"""Where everything of one campaign lies below results/<campaign>/, and the project's own folders."""

from __future__ import annotations

import json
import os
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from scission.records.atomic import write_whole

PROJECT = Path(__file__).resolve().parents[3]
"""The folder that holds the Snakefile."""


@dataclass(frozen=True)
class Layout:
    """Paths of one campaign's results; ``folder`` is results/<campaign>."""

    folder: Path

    @property
    def plan(self) -> Path:
        """Folder of the plan: plan.json, points.csv, campaign.yaml and jobs/."""
        return self.folder / "plan"

    def job_plan(self, job: str) -> Path:
        """Everything one job needs to know."""
        return self.plan / "jobs" / f"{job}.json"

    def job_done(self, job: str) -> Path:
        """The one declared output of a job, written last."""
        return self.folder / "jobs" / f"{job}.json"

    def worker(self, job: str) -> Path:
        """Claim and progress of the worker that computes a job at present."""
        return self.folder / "workers" / f"{job}.json"

    def running(self, key: str) -> Path:
        """Marker that lies there while a calculation runs."""
        return self.folder / "running" / f"{key}.json"

    def request(self, key: str) -> Path:
        """Request to compute a record again."""
        return self.folder / "retries" / f"{key}.json"

    @property
    def summary(self) -> Path:
        """What the terminal shows at the end of a run."""
        return self.folder / "summary.txt"

    @property
    def grants(self) -> Path:
        """Factors on the time and memory of jobs that a retry asked for."""
        return self.folder / "retries" / "grants.json"

    @property
    def run_file(self) -> Path:
        """Who runs the campaign at present."""
        return self.folder / "run.json"

    @property
    def engine_log(self) -> Path:
        """What the engine said in the latest run."""
        return self.folder / "logs" / "engine.log"

    @property
    def gathered(self) -> Path:
        """All records in one file."""
        return self.folder / "campaign.h5"

    @property
    def failures(self) -> Path:
        """List of the points without a good result."""
        return self.folder / "failures.csv"


def entries(folder: Path, suffix: str) -> Iterator[os.DirEntry[str]]:
    """Give what lies in a folder and has that ending, hidden files left out; nothing if there is no such folder."""
    try:
        with os.scandir(folder) as found:
            yield from (e for e in found if e.name.endswith(suffix) and not e.name.startswith("."))
    except (FileNotFoundError, NotADirectoryError):
        return


def read_json(path: Path) -> dict[str, Any] | None:
    """Return the object in a small JSON file, or None if there is none or it is not whole."""
    try:
        data = json.loads(path.read_text(encoding="utf-8"))
    except (FileNotFoundError, NotADirectoryError, ValueError):
        return None
    return data if isinstance(data, dict) else None


def write_json(path: Path, data: dict[str, Any], durable: bool = True) -> None:
    """Write a small JSON file whole or not at all; markers of a process at work need not be durable.

    Raises:
        OSError: the folder cannot be written or the disk is full.
    """
    write_whole(path, json.dumps(data, indent=1).encode("utf-8"), durable)
