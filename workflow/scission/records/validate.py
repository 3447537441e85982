"""What a record may hold: the rules of the schema, checked before anything is written."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from scission.records.schema import ARRAYS, REASONS, SCALARS, STATUSES

if TYPE_CHECKING:
    from scission.records.store import Record

_SCALARS = {item.name: item for item in SCALARS}
_ARRAYS = {item.name: item for item in ARRAYS}


def one_line(text: str, limit: int = 500) -> str:
    """The text as one line of ASCII, cut after ``limit`` characters."""
    line = " ".join(text.split()).encode("ascii", "backslashreplace").decode("ascii")
    return line if len(line) <= limit else line[: limit - 4] + " ..."


def finite_or_none(value: float | int) -> float | int | None:
    """The number as JSON can hold it: Python's own type, None for one that is not finite."""
    if isinstance(value, (bool, int, np.integer)):
        return int(value)
    return float(value) if math.isfinite(value) else None


def not_finite(record: Record) -> list[str]:
    """Names of the scalars, diagnostics and arrays with a value that is not finite."""
    numbers = record.scalars | record.diagnostics
    names = [name for name, value in numbers.items() if not math.isfinite(value)]
    floats = {name: array for name, array in record.arrays.items() if np.asarray(array).dtype.kind in "fc"}
    return names + [name for name, array in floats.items() if not np.all(np.isfinite(array))]


def lacks_a_number(record: Record) -> bool:
    """Whether a scalar or diagnostic is not finite, or a point has no energy; tells nothing of the arrays."""
    numbers = (*record.scalars.values(), *record.diagnostics.values())
    return not all(map(math.isfinite, numbers)) or (record.kind == "point" and "energy" not in record.scalars)


def settled(record: Record) -> Record:
    """The record as it may be stored: converged with a number that is not finite means failed."""
    if record.status != "converged":
        return record
    names = not_finite(record)
    if record.kind == "point" and "energy" not in record.scalars:
        names.append("energy")
    if not names:
        return record
    message = f"{', '.join(names)}: not a finite number although the iterations converged"
    return replace(record, status="failed", reason="not-finite", message=message)


def problems(record: Record) -> list[str]:
    """Everything in which the record departs from the schema, in words; empty if nothing."""
    return list(_word_problems(record)) + list(_number_problems(record))


def _word_problems(record: Record) -> Iterator[str]:
    if record.status not in STATUSES:
        yield f"status {record.status!r} is not one of {', '.join(STATUSES)}"
    if record.reason not in REASONS:
        yield f"reason {record.reason!r} is not one of {', '.join(filter(None, REASONS))}"
    if record.attempts < 1:
        yield f"attempts is {record.attempts}, a record comes from at least one"


def _number_problems(record: Record) -> Iterator[str]:
    for name in record.scalars.keys() - _SCALARS.keys():
        yield f"scalar {name!r} is not in the schema"
    for name, array in record.arrays.items():
        yield from _array_problems(name, array)
    if record.status != "converged":
        return
    for name in not_finite(record):
        yield f"{name} is not finite in a converged record"
    if record.kind == "point" and "energy" not in record.scalars:
        yield "a converged point without energy"


def _array_problems(name: str, array: np.ndarray) -> Iterator[str]:
    known = _ARRAYS.get(name)
    if known is None:
        yield f"array {name!r} is not in the schema"
        return
    if np.ndim(array) != len(known.shape):
        yield f"array {name!r} has shape {np.shape(array)}, the schema says ({', '.join(known.shape)})"
    if not np.can_cast(np.asarray(array).dtype, known.dtype, "same_kind"):
        yield f"array {name!r} has dtype {np.asarray(array).dtype}, the schema says {known.dtype}"
