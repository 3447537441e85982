"""The tasks a supervised child process can run, by kind.

Contract for a new kind: a function ``(task, store, watch) -> Record`` in ``TASKS``; the record is written
here, once, whole.  An exception leaves no record: the guard that called turns it into a failed one.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from scission.records.store import Record, Store

from .correlate import correlate_point
from .coulson_fischer import add_coulson_fischer
from .establish import establish_reference, finish_reference, swap_spins
from .fragment_levels import compute_fragment
from .labels import label_states
from .recording import Stopwatch

TASKS: dict[str, Callable[[dict[str, Any], Store, Stopwatch], Record]] = {
    "reference": establish_reference,
    "swap": swap_spins,
    "label": label_states,
    "finish": finish_reference,
    "coulson_fischer": add_coulson_fischer,
    "correlate": correlate_point,
    "fragment": compute_fragment,
}


def run_task(task: dict[str, Any], store: Store) -> dict[str, Any]:
    """Run one task in this process, write its record and return a summary that fits in a line of JSON."""
    record = TASKS[task["kind"]](task, store, Stopwatch())
    store.write(record)
    return {
        "key": record.key,
        "status": record.status,
        "reason": record.reason,
        "message": record.message,
        "energy": record.scalars.get("energy"),
        "wall_s": record.scalars.get("wall_s"),
    }
