"""The supervised child process: reads tasks as JSON lines, runs them one by one, answers in JSON lines.

Answers go to the descriptor that was standard output at the start; from then on standard output is
the log, so that nothing a calculation prints can be taken for an answer.

    python -m scission.execution.child RESULTS_FOLDER RUNNER GUARD_PID
"""

from __future__ import annotations

import json
import os
import queue
import sys
import threading
import traceback
from pathlib import Path
from typing import IO, Any

from scission.execution import drills
from scission.execution.ledger import Ledger
from scission.execution.processes import die_with_parent
from scission.records.atomic import UnwritableError


def load_runner(name: str) -> drills.Runner:
    """Return the function that runs a task: the chemistry, or one of the fault drills.

    Raises:
        KeyError: no runner of that name.
    """
    if name == "chemistry":
        from scission.chemistry.tasks import run_task

        return run_task
    return drills.RUNNERS[name]


def answer_task(task: dict[str, Any], folder: Path, runner: drills.Runner) -> dict[str, Any]:
    """Run one task; whatever it raises becomes an answer, since a failed calculation is a result."""
    drills.journal(task, "start")
    try:
        drills.misbehave(drills.requested(task))
        answer = runner(task, Ledger(folder, task))
        drills.journal(task, answer["status"])
        return {"answer": answer}
    except UnwritableError as error:  # says nothing about the calculation, so it must not become its result
        return {"unwritable": [error.errno, error.strerror]}
    except Exception as error:
        traceback.print_exc()
        words = " ".join(f"{type(error).__name__}: {error}".split())
        return {"raised": words, "memory": isinstance(error, MemoryError)}


def main(arguments: list[str]) -> None:
    """Answer tasks until standard input closes."""
    folder, name, parent = Path(arguments[0]), arguments[1], int(arguments[2])
    die_with_parent(parent)
    answers = os.fdopen(os.dup(1), "w", encoding="utf-8")
    os.dup2(2, 1)
    tasks = _reader()
    runner = load_runner(name)
    _send(answers, {"ready": True})
    while True:
        _send(answers, answer_task(tasks.get(), folder, runner))


def _reader() -> queue.Queue[dict[str, Any]]:
    tasks: queue.Queue[dict[str, Any]] = queue.Queue()

    def read() -> None:
        for line in sys.stdin:
            tasks.put(json.loads(line))
        os._exit(0)  # the guard is gone or done: nobody is left to answer to, even in mid-calculation

    threading.Thread(target=read, daemon=True).start()
    return tasks


def _send(answers: IO[str], message: dict[str, Any]) -> None:
    answers.write(json.dumps(message) + "\n")
    answers.flush()


if __name__ == "__main__":
    main(sys.argv[1:])
