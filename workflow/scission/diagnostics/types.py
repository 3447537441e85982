"""What a diagnostic is, and how it says that it has nothing to say."""

from __future__ import annotations

from collections.abc import Callable
from typing import NamedTuple

from scission.solution import Solution


class Absent(NamedTuple):
    """A diagnostic is not meaningful for a solution, and why."""

    reason: str


class Diagnostic(NamedTuple):
    """One diagnostic: name in tables, published symbol, unit, meaning, source and the function itself."""

    name: str
    symbol: str
    unit: str
    meaning: str
    source: str
    evaluate: Callable[[Solution], float | Absent]
