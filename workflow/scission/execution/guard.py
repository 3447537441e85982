"""Runs calculations in a supervised child process, under budgets of wall time and memory.

Whatever happens to the child (it hangs, grows, raises, is killed), the calculation ends as a record
with a status and a reason, and the next one gets a fresh child.  Nothing here imports chemistry.
"""

from __future__ import annotations

import json
import os
import select
import signal
import subprocess
import sys
import time
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from types import FrameType, TracebackType
from typing import IO, Any

from scission.execution import outcomes
from scission.execution.layout import Layout
from scission.execution.ledger import Ledger
from scission.execution.markers import clear_running, mark_running
from scission.execution.processes import kill_group, resident_mb

DEFAULT_BUDGET_S = 24 * 3600.0
DEFAULT_MEMORY_MB = 4000.0
START_LIMIT_S = 600.0
"""Importing the chemistry from a slow network disk can take minutes; it counts for no calculation."""
_POLL_S = 0.25
_NEAR_BUDGET = 0.8
_ONE_THREAD = dict.fromkeys(
    ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS", "NUMEXPR_NUM_THREADS"), "1"
)
_SIGNALS = (signal.SIGTERM, signal.SIGINT, signal.SIGUSR1)


class StoppedError(Exception):
    """A signal asked the guard to stop; ``signum`` says which."""

    def __init__(self, signum: int) -> None:
        super().__init__(f"stopped by {signal.Signals(signum).name}")
        self.signum = signum


class ChildStartError(Exception):
    """The child process could not get ready: a fault of the installation, not of a calculation."""


@dataclass
class Budget:
    """What one calculation may use: wall time in s, resident memory in MB (10^6 bytes)."""

    wall_s: float
    memory_mb: float

    @classmethod
    def of(cls, task: dict[str, Any]) -> Budget:
        """Return the budget a task carries, or the defaults."""
        wall, memory = task.get("budget_s"), task.get("memory_mb")
        return cls(
            DEFAULT_BUDGET_S if wall is None else float(wall),
            DEFAULT_MEMORY_MB if memory is None else float(memory),
        )


class Guard:
    """Supervisor of one child process after another; use it as a context manager.

    Args:
        folder: results/<campaign>.
        job: id of the job it works for (for the markers).
        runner: which function the child runs tasks with (see ``child.load_runner``).
        pulse: called several times a second while it supervises; what it raises ends the calculation.
    """

    def __init__(
        self, folder: Path, job: str, runner: str = "chemistry", pulse: Callable[[], None] = lambda: None
    ) -> None:
        self.layout = Layout(folder)
        self.job = job
        self.runner = runner
        self.pulse = pulse
        self._child: subprocess.Popen[bytes] | None = None
        self._answers: IO[bytes] | None = None
        self._rest = b""
        self._stop = 0
        self._handlers: dict[int, Any] = {}

    def __enter__(self) -> Guard:
        self._handlers = {number: signal.signal(number, self._on_signal) for number in _SIGNALS}
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._end_child()
        for number, handler in self._handlers.items():
            signal.signal(number, handler)

    def run(self, task: dict[str, Any]) -> dict[str, Any]:
        """Run one task under its budget; return its answer, or that of the failure that was recorded.

        Raises:
            StoppedError: a signal came; the running calculation was ended and left no record.
            ChildStartError: no child process can be had.
        """
        self._check_stop()
        if self._child is None:
            self._start_child()
        mark_running(self.layout, task["key"], task["attempt"], self.job)
        started = time.time()
        message = self._supervise(task, Budget.of(task))
        if "answer" in message:
            answer = message["answer"]
        else:
            ledger = Ledger(self.layout.folder, task)
            answer = outcomes.write_failure(ledger, task, outcomes.from_message(message), started)
        clear_running(self.layout, task["key"])
        return answer

    def _supervise(self, task: dict[str, Any], budget: Budget) -> dict[str, Any]:
        child = self._child
        assert child is not None
        assert child.stdin is not None
        deadline = time.monotonic() + budget.wall_s
        peak = 0.0
        try:
            child.stdin.write(json.dumps(task).encode() + b"\n")
            child.stdin.flush()
        except BrokenPipeError:
            return self._ended(peak, budget)
        while True:
            message = self._next_message(min(_POLL_S, max(0.0, deadline - time.monotonic())))
            if message is not None:
                return message or self._ended(peak, budget)
            peak = max(peak, resident_mb(child.pid))
            self._check_stop()
            if peak > budget.memory_mb:
                return self._overrun("memory-limit", peak, budget)
            if time.monotonic() >= deadline:
                return self._overrun("time-limit", peak, budget)

    def _overrun(self, reason: str, peak: float, budget: Budget) -> dict[str, Any]:
        self._end_child()
        if reason == "memory-limit":
            words = f"used {peak:.0f} MB of memory, the budget is {budget.memory_mb:.0f} MB"
        else:
            words = f"was not done after its {budget.wall_s:g} s of wall time"
        return {"reason": reason, "message": words}

    def _ended(self, peak: float, budget: Budget) -> dict[str, Any]:
        """Describe a child that ended in mid-calculation."""
        assert self._child is not None
        code = self._child.wait()
        self._end_child()
        self._check_stop()
        if code >= 0:
            return {"reason": "killed", "message": f"the process ended by itself with exit status {code}"}
        words = f"the process was ended by {signal.Signals(-code).name}"
        if -code == signal.SIGKILL and peak > _NEAR_BUDGET * budget.memory_mb:
            words += f" at {peak:.0f} MB of memory, near its budget: the system may have run out of memory"
        return {"reason": "killed", "message": words}

    def _start_child(self) -> None:
        command = [sys.executable, "-m", "scission.execution.child"]
        self._child = subprocess.Popen(
            [*command, str(self.layout.folder), self.runner, str(os.getpid())],
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            bufsize=0,
            env=_ONE_THREAD | dict(os.environ),
            start_new_session=True,
        )
        self._answers, self._rest = self._child.stdout, b""
        deadline = time.monotonic() + START_LIMIT_S
        message = None
        while message is None and time.monotonic() < deadline:
            message = self._next_message(_POLL_S)
            self._check_stop()
        if not message or not message.get("ready"):
            self._end_child()
            raise ChildStartError("the calculating process did not get ready; its words are in the log above")

    def _next_message(self, timeout_s: float) -> dict[str, Any] | None:
        """Return the child's next message, {} at its end, None when there is nothing in time."""
        assert self._answers is not None
        if b"\n" not in self._rest:
            if not select.select([self._answers], [], [], timeout_s)[0]:
                return None
            data = os.read(self._answers.fileno(), 1 << 16)
            if not data:
                return {}
            self._rest += data
            if b"\n" not in self._rest:
                return None
        line, self._rest = self._rest.split(b"\n", 1)
        return dict(json.loads(line))

    def _end_child(self) -> None:
        if self._child is None:
            return
        kill_group(self._child.pid)
        self._child.wait()
        for pipe in (self._child.stdin, self._child.stdout):
            if pipe is not None:
                pipe.close()
        self._child = None

    def _on_signal(self, number: int, frame: FrameType | None) -> None:  # noqa: ARG002
        self._stop = number

    def _check_stop(self) -> None:
        if self._stop:
            self._end_child()
            raise StoppedError(self._stop)
        self.pulse()
