"""What a diagnostic is, and how it says that it has nothing to say."""

from __future__ import annotations

from collections.abc import Callable
from typing import NamedTuple

from scission.solution import Solution


class Absent(NamedTuple):
    """A diagnostic is not meaningful for a solution, and why."""

    reason: str


class Diagnostic(NamedTuple):
    """One diagnostic.

    ``name`` stands in tables, ``symbol`` is the published one, ``evaluate`` the function itself.
    ``of_reference`` says that a correlated level takes the value of its reference where it has none of its
    own; ``calculation`` names the extra calculation that it needs (a key of ``CALCULATIONS``), "" for none.
    """

    name: str
    symbol: str
    unit: str
    meaning: str
    source: str
    evaluate: Callable[[Solution], float | Absent]
    of_reference: bool = False
    calculation: str = ""


class Calculation(NamedTuple):
    """A calculation that a campaign asks for by including one of the diagnostics it gives.

    ``price`` is its cost relative to RHF, CCSD and (T) together in the same basis, for the forecast.  With
    ``per_level`` it continues from the level's own reference; otherwise the geometry and the basis decide
    its result, and it is done once for all levels of a scan with the same basis.
    """

    name: str
    price: float
    per_level: bool
    meaning: str


FROM_FRAGMENTS = "fragments"
"""``calculation`` of what the analysis fills in from the energies of the fragments."""
