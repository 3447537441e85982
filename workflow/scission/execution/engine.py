"""The workflow engine as a command: how it is called, where, and with what around it."""

from __future__ import annotations

import os
import shlex
import subprocess
import sys
import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import psutil
import yaml

from scission.execution.layout import PROJECT
from scission.execution.processes import MEGABYTE, die_with_parent

ATTEMPTS = 2
"""How often the engine starts a job at most; the profiles' ``retries`` is one less."""
_MEMORY_SHARE = 0.9
_CALLER = "SCISSION_CALLER"


@dataclass(frozen=True)
class Command:
    """One call of the engine for a campaign file; ``extra`` are a person's own options for it.

    ``queue_name`` is what the names of its jobs in Slurm's queue begin with.
    """

    campaign_file: Path
    results: Path
    profile: str = "local"
    settings: tuple[str, ...] = ()
    extra: tuple[str, ...] = ()
    queue_name: str = ""

    def words(self) -> list[str]:
        """Return the command as a list of words.

        Raises:
            FileNotFoundError: there is no such profile.
        """
        return [
            *(sys.executable, "-m", "snakemake"),
            *("--snakefile", str(PROJECT / "Snakefile")),
            *("--profile", str(profile_folder(self.profile))),
            *("--configfile", str(self.campaign_file)),
            *("--config", f"results={self.results}", *(f"{k}={v}" for k, v in self.config().items())),
            "--rerun-incomplete",
            *self._memory(),
            *_without_config(self.extra)[0],
            *(("--slurm-jobname-prefix", self.queue_name) if self.queue_name else ()),
        ]

    def config(self) -> dict[str, str]:
        """Return the settings of the profile, of the caller and of a person's --config, later ones winning.

        They are merged here because the engine takes only the last --config it meets.
        """
        own = _profile_config(profile_folder(self.profile))
        return own | dict(_pair(word) for word in [*self.settings, *_without_config(self.extra)[1]])

    def executor(self) -> str:
        """Return what the engine hands jobs to: "local", "slurm" ..., by its options or the profile.

        Raises:
            FileNotFoundError: there is no such profile.
        """
        for word, following in zip(self.extra, [*self.extra[1:], ""], strict=False):
            option, _, value = word.partition("=")
            if option in ("--executor", "-e"):
                return value or following
        return str(_content(profile_folder(self.profile)).get("executor") or "local")

    def _memory(self) -> list[str]:
        own = any(word.split("=")[0] in ("--resources", "--res") for word in self.extra)
        if self.profile != "local" or own:
            return []
        return ["--resources", f"mem_mb={int(_MEMORY_SHARE * psutil.virtual_memory().total / MEGABYTE)}"]

    def __str__(self) -> str:
        return shlex.join(self.words())


def _pair(word: str) -> tuple[str, str]:
    key, _, value = word.partition("=")
    return key, value


def _profile_config(folder: Path) -> dict[str, str]:
    entries = _content(folder).get("config") or []
    return dict(entries) if isinstance(entries, dict) else dict(_pair(word) for word in entries)


def _content(profile: Path) -> dict[str, Any]:
    return yaml.safe_load((profile / "config.yaml").read_text(encoding="utf-8")) or {}


def _without_config(extra: Sequence[str]) -> tuple[list[str], list[str]]:
    """Split a person's options into all others and the values given to --config."""
    others: list[str] = []
    values: list[str] = []
    taking = False
    for word in extra:
        if word in ("--config", "-C"):
            taking = True
        elif taking and not word.startswith("-"):
            values.append(word)
        else:
            taking = False
            others.append(word)
    return others, values


def profile_folder(name: str) -> Path:
    """Return the folder of a profile: one of the project's by name, or any by its path.

    Raises:
        FileNotFoundError: neither is there.
    """
    own = PROJECT / "config" / "profiles" / name
    for folder in (own, Path(name).expanduser().absolute()):
        if (folder / "config.yaml").is_file():
            return folder
    known = sorted(p.parent.name for p in (PROJECT / "config" / "profiles").glob("*/config.yaml"))
    raise FileNotFoundError(
        f"there is no profile {name!r}; known are {', '.join(known)}, or give a folder's path"
    )


def environment() -> dict[str, str]:
    """Return the environment for the engine: all caches inside the project, and who called it."""
    cache = PROJECT / ".cache"
    inside = {"XDG_CACHE_HOME": str(cache), "MPLCONFIGDIR": str(cache / "matplotlib")}
    return dict(os.environ) | inside | {"PYTHONUNBUFFERED": "1", _CALLER: str(os.getpid())}


def end_with_caller() -> None:
    """Have this process, the engine's, end when the command that called it is killed.

    An engine that lived on could not be seen from another machine, and would go on submitting jobs.
    What it has started goes on; the next run deals with that.
    """
    if _CALLER in os.environ:
        die_with_parent(int(os.environ.pop(_CALLER)))


def call(
    command: Command,
    log: Path | None,
    started: Callable[[int], None] = lambda _: None,
    tick: Callable[[], None] = lambda: None,
    halt: Callable[[], None] = lambda: None,
) -> int:
    """Run the engine to its end and return its exit status, ``INTERRUPTED`` if a person stopped it.

    Args:
        log: file for what it says; None lets it speak to the terminal.
        started: told the number of its process.
        tick: called twice a second meanwhile.
        halt: called some seconds after an interrupt that did not reach the engine by itself.
    """
    if log is None:
        return _wait(subprocess.Popen(command.words(), env=environment()), started, tick, halt)
    log.parent.mkdir(parents=True, exist_ok=True)
    with log.open("wb") as out:
        process = subprocess.Popen(command.words(), env=environment(), stdout=out, stderr=subprocess.STDOUT)
        return _wait(process, started, tick, halt)


INTERRUPTED = 130
_TICK_S = 0.5
_GRACE_S = 2.0
"""A terminal's interrupt reaches engine and workers too; a second one at once would cut their tidying up."""


def _wait(
    process: subprocess.Popen[bytes],
    started: Callable[[int], None],
    tick: Callable[[], None],
    halt: Callable[[], None],
) -> int:
    started(process.pid)
    interrupted = float("inf")
    while True:
        try:
            code = process.wait(timeout=_TICK_S)
            return code if interrupted == float("inf") else INTERRUPTED
        except subprocess.TimeoutExpired:
            tick()
            if time.monotonic() > interrupted + _GRACE_S:
                halt()
        except KeyboardInterrupt:
            interrupted = min(interrupted, time.monotonic())
            print("\nstopping: waiting for the engine to end its jobs", file=sys.stderr, flush=True)


_TELLING = """
-n --dry-run --dryrun -S --summary -D --detailed-summary --dag --rulegraph --filegraph --d3dag --lint
-l --list --list-rules --lt --list-target-rules --lc --list-changes --lu --list-untracked --unlock
-t --touch --report --archive --cm --cleanup-metadata --delete-all-output -v --version -h --help
"""
INFORMATIVE = frozenset(_TELLING.split())
"""Options that make the engine tell or tidy something instead of computing."""


def is_informative(extra: Sequence[str]) -> bool:
    """Whether the engine is asked to tell something, which then belongs on the terminal."""
    return any(word.split("=")[0] in INFORMATIVE for word in extra)
