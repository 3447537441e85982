"""The run of one campaign from the terminal: the engine, the progress line, the summary."""

from __future__ import annotations

import argparse
import csv
import os
import signal
import sys
import time
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field, replace
from pathlib import Path
from types import FrameType

from scission.cli.common import FAULT, POINTS_FAILED, WrongInputError, tell
from scission.execution import engine, planning
from scission.execution.layout import Layout, read_json
from scission.execution.markers import live_workers
from scission.execution.orphans import OrphansError, Settling
from scission.execution.processes import identity, is_alive
from scission.execution.progress import Progress, duration
from scission.execution.runfile import CONFIRM_S, AlreadyRunningError, RunFile, hold

_LINES_OF_TROUBLE = 40
_EVERY_S = {True: 1.0, False: 15.0}
"""How often progress is shown, s: on a terminal, elsewhere."""


def run_campaign(
    path: Path,
    name: str,
    results: Path,
    args: argparse.Namespace,
    extra: Sequence[str],
    settings: Sequence[str] = (),
    prepare: Callable[[], None] = lambda: None,
) -> int:
    """Run the campaign in ``path``, called ``name``; return the exit status of ``scission run``.

    ``prepare`` is called once the campaign is held and its plan is up to date.

    Raises:
        WrongInputError: no such profile, a setting that is wrong.
    """
    layout = Layout(results / name)
    command = engine.Command(path, results, args.on, tuple(settings), tuple(extra))
    try:
        options = planning.plan_options(command.config())
        with hold(layout, tell, 0.0 if command.executor() == "local" else CONFIRM_S) as run:
            planning.refresh(planning.read_config(path), path, results, options)
            return Session(layout, command, run, args.verbose, prepare, args.orphans).go()
    except (FileNotFoundError, ValueError, PermissionError) as error:
        raise WrongInputError(str(error)) from None
    except (AlreadyRunningError, OrphansError) as error:
        tell(str(error))
        return FAULT


@dataclass
class Session:
    """One run that holds the campaign's run file."""

    layout: Layout
    command: engine.Command
    run: RunFile
    verbose: bool
    prepare: Callable[[], None]
    orphans: str
    display: Display = field(init=False)
    halt: Halt = field(init=False)

    def __post_init__(self) -> None:
        self.display = Display(self.layout)
        self.halt = Halt(self.layout)

    def go(self) -> int:
        """Settle what an earlier run left, run the engine, salvage, sum up.

        Raises:
            OrphansError: it cannot be told whether an earlier run still is at work.
        """
        if engine.is_informative(self.command.extra):
            self.run.put_back()
            self.prepare()
            tell(str(self.command))
            return engine.call(self.command, None)
        settling = self._settle()
        self.prepare()
        with self.halt.on_termination():
            code = self._call(self.command)
            if code not in (0, engine.INTERRUPTED) and not self.run.lost:
                self._show_trouble()
                if self.command.queue_name:  # an engine in trouble may leave its jobs behind
                    settling.empty_queue(self.command.queue_name)
                code = self._salvage()
        if self.run.lost:
            tell("this campaign was taken over by a run on another machine, which goes on with it")
            return FAULT
        return code if code else self._sum_up()

    def _settle(self) -> Settling:
        """Deal with what earlier runs left, and name the jobs of this one for the next."""
        name, on_slurm = self.run.queue_name(self.layout), self.command.executor() == "slurm"
        settling = Settling(self.layout, self.run.left, tell, self._tick, self.orphans)
        try:
            settling.settle(name if on_slurm or self.run.left.get("queue") else "")
        except OrphansError:
            self.run.put_back()
            self.run.clear()
            raise
        queue = {"name": name, "folder": str(self.layout.folder)} if on_slurm else None
        self.run.note(queue=queue, engine=None)
        self.command = replace(self.command, queue_name=name if on_slurm else "")
        return settling

    def _call(self, command: engine.Command) -> int:
        tell(str(command))
        log = None if self.verbose else self.layout.engine_log
        code = engine.call(command, log, self._started, self._tick, self.halt)
        self.display.end()
        return code

    def _started(self, pid: int) -> None:
        self.run.note(engine=identity(pid))

    def _salvage(self) -> int:
        """Bring together what there is: jobs that vanished must not keep the others' results back."""
        tell("bringing together what there is; starting the same command again computes what is missing")
        settings = (*self.command.settings, "salvage=1")
        code = self._call(replace(self.command, settings=settings))
        if code not in (0, engine.INTERRUPTED):
            self._show_trouble()
        return code

    def _show_trouble(self) -> None:
        if not self.verbose:
            lines = self.layout.engine_log.read_text(encoding="utf-8", errors="replace").splitlines()
            tell("\n".join(["the workflow engine ended with an error; the end of what it said:"]))
            tell("\n".join(f"  | {line}" for line in lines[-_LINES_OF_TROUBLE:]))
            tell(f"all of it: {self.layout.engine_log}")

    def _sum_up(self) -> int:
        print(self.layout.summary.read_text(encoding="utf-8"), flush=True)
        return POINTS_FAILED if has_failures(self.layout.failures) else 0

    def _tick(self) -> None:
        if self.run.lost:
            self.halt()
        if not self.verbose:
            self.display.show()


def has_failures(path: Path) -> bool:
    """Whether a failure list names any point.

    Raises:
        FileNotFoundError: there is no list, although the run has ended well.
    """
    with path.open(encoding="utf-8", newline="") as handle:
        return any(True for _ in csv.DictReader(handle))


class Halt:
    """An orderly stop of engine and workers, once; what they have finished is kept.

    The engine by itself would wait for all its jobs.
    """

    def __init__(self, layout: Layout) -> None:
        self.layout = layout
        self.done = False

    def __call__(self) -> None:
        """Interrupt the workers and the engine of this run."""
        if self.done:
            return
        self.done = True
        engine_process = (read_json(self.layout.run_file) or {}).get("engine") or {}
        workers = [read_json(self.layout.worker(job)) or {} for job in live_workers(self.layout)]
        for who in [*workers, engine_process]:
            if is_alive(who):
                os.kill(int(who["pid"]), signal.SIGINT)

    @contextmanager
    def on_termination(self) -> Iterator[None]:
        """Stop when this command is told to end (SIGTERM)."""

        def stop(number: int, frame: FrameType | None) -> None:  # noqa: ARG001
            self()
            raise KeyboardInterrupt

        previous = signal.signal(signal.SIGTERM, stop)
        try:
            yield
        finally:
            signal.signal(signal.SIGTERM, previous)


class Display:
    """The progress of a campaign: one line that changes on a terminal, now and then a line elsewhere."""

    def __init__(self, layout: Layout) -> None:
        self.progress: Progress | None = None
        self.layout = layout
        self.tty = sys.stderr.isatty()
        self.started = time.monotonic()
        self.shown = self.started
        self.first_done: int | None = None
        self.last = ""

    def show(self) -> None:
        """Show how far the campaign is, if it is time to."""
        now = time.monotonic()
        if now - self.shown < _EVERY_S[self.tty]:
            return
        line, self.shown = self.line(now), now
        if line != self.last or self.tty:
            print(
                f"\r\033[K{line}" if self.tty else line,
                end="" if self.tty else "\n",
                file=sys.stderr,
                flush=True,
            )
            self.last = line

    def line(self, now: float) -> str:
        """Return the counts and the time that is left, as far as that can be told."""
        self.progress = self.progress or Progress.of(self.layout)
        points, references = self.progress.points(), self.progress.reference_count()
        text = f"references {references.done}/{references.total}, points {points.done}/{points.total}: "
        text += f"{points.good} good, {points.failed} not, {points.left} left"
        done, left = references.done + points.done, references.left + points.left
        self.first_done = done if self.first_done is None else self.first_done
        new = done - self.first_done
        if new >= 3 and left:
            text += f"; about {duration((now - self.started) * left / new)} to go"
        return text

    def end(self) -> None:
        """Leave the changing line behind."""
        if self.tty and self.last:
            print(file=sys.stderr, flush=True)
            self.last = ""
