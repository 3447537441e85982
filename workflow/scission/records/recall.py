"""The fate of a planned point as a record, also when its job vanished and left nothing."""

from __future__ import annotations

import json
from typing import Any, Protocol

from scission.records.schema import REASONS
from scission.records.store import Record, Store

_TOLD = {"started": "at", "host": "on", "job": "in job"}
_NEEDS_CONVERGENCE = ("energy", "energy_reference", "energy_correlation", "energy_triples")


class Planned(Protocol):
    """What is asked of a point of the plan (see ``scission.plan``)."""

    @property
    def scan(self) -> str: ...
    @property
    def level(self) -> str: ...
    @property
    def number(self) -> int: ...
    @property
    def coordinate(self) -> tuple[float, ...]: ...
    @property
    def names(self) -> tuple[str, ...]: ...
    @property
    def key(self) -> str: ...


def recall(store: Store, key: str, arrays: bool | tuple[str, ...] = False) -> Record:
    """The record of a planned point; one of status ``lost`` if there is none that can be read.

    ``attempts`` of a lost point is what the marker of its last start says, 0 if it never started.

    Raises:
        OSError: the file system does not give out a record that is there.
    """
    record = store.read("point", key, arrays)
    if record is not None:
        return record
    reason = "damaged" if store.aside("point", key).exists() else "lost"
    marker = _marker(store, key)
    attempts = _marked_attempts(marker)
    message = REASONS[reason] + _last_start(marker)
    return Record(key, "point", "lost", reason=reason, message=message, attempts=attempts)


def recall_point(store: Store, point: Planned, arrays: bool | tuple[str, ...] = False) -> Record:
    """The record of a planned point with the costly diagnostics that have records of their own.

    Raises:
        OSError: the file system does not give out a record that is there.
    """
    record = recall(store, point.key, arrays)
    for calculation, key in getattr(point, "extras", ()):  # only points of a plan that includes some have any
        extra = recall(store, key)
        record.diagnostics = {**record.diagnostics, **extra.diagnostics}
        record.absent = {**record.absent, **extra.absent}
        if extra.status not in ("converged", "unconverged"):
            record.absent[calculation] = f"{extra.status}: {extra.message}"
    return record


def settled_scalars(record: Record) -> dict[str, float]:
    """Scalars fit for a table: a calculation that did not converge has a cost but no energy.

    The last energy of its iterations stays in the record and in its message.
    """
    if record.status == "converged":
        return dict(record.scalars)
    return {name: value for name, value in record.scalars.items() if name not in _NEEDS_CONVERGENCE}


def _marker(store: Store, key: str) -> dict[str, Any] | None:
    """What the last start of a calculation left; {} if a kill cut it short, None if it never started."""
    try:
        marker = json.loads((store.folder / "running" / f"{key}.json").read_text(encoding="utf-8"))
    except FileNotFoundError:
        return None
    except ValueError:
        return {}
    return marker if isinstance(marker, dict) else {}


def _marked_attempts(marker: dict[str, Any] | None) -> int:
    if marker is None:
        return 0
    try:
        return int(marker["attempt"])
    except (ValueError, KeyError, TypeError):
        return 1  # it was started, at least


def _last_start(marker: dict[str, Any] | None) -> str:
    if marker is None:
        return "; it was never started"
    told = [f"{word} {marker[name]}" for name, word in _TOLD.items() if marker.get(name)]
    return "; last started " + ", ".join(told) if told else ""
