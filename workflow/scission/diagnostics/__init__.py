"""Wavefunction diagnostics: from a :class:`scission.solution.Solution` to one number each.

Contract for a new member
-------------------------
1. Write a function ``evaluate(solution) -> float | Absent`` in the file of its family (or a new file).  Its
   docstring states formula, unit, shapes, source.  It must not depend on the phases or order of degenerate
   orbitals, must be finite, and must say itself (``Absent(reason)``) when it is not meaningful for the
   solution it is given: it never returns zero for "unknown" and never raises for a valid solution.
2. Add a :class:`Diagnostic` to ``DIAGNOSTICS`` in ``registry.py``.  The key is the name used in records and tables.
3. If it has a published threshold, add it to :mod:`scission.thresholds`, with its source, and say in
   :mod:`scission.thresholds.rule` what it weighs.
4. If it needs a calculation of its own, name that in ``calculation``, enter it in ``CALCULATIONS`` with its
   price, and write it in :mod:`scission.chemistry.extras`.

Every member inherits the tests in ``tests/contract/test_diagnostics.py``.
"""

from __future__ import annotations

from collections.abc import Iterable

from scission.solution import Solution

from .registry import CALCULATIONS, DIAGNOSTICS
from .types import FROM_FRAGMENTS, Absent, Calculation, Diagnostic


def evaluate_all(solution: Solution, calculation: str = "") -> tuple[dict[str, float], dict[str, str]]:
    """Return the values of every diagnostic that is meaningful for ``solution``, and why others are not.

    Without ``calculation`` these are the ones that come with every level, else those it gives.
    """
    values: dict[str, float] = {}
    absent: dict[str, str] = {}
    for name, diagnostic in DIAGNOSTICS.items():
        if diagnostic.calculation != calculation:
            continue
        result = diagnostic.evaluate(solution)
        if isinstance(result, Absent):
            absent[name] = result.reason
        else:
            values[name] = float(result)
    return values, absent


def calculations_for(included: Iterable[str]) -> list[Calculation]:
    """Return the extra calculations that give the included diagnostics, each once."""
    names = [DIAGNOSTICS[name].calculation for name in included]
    return [CALCULATIONS[name] for name in dict.fromkeys(names) if name in CALCULATIONS]


__all__ = [
    "CALCULATIONS",
    "DIAGNOSTICS",
    "FROM_FRAGMENTS",
    "Absent",
    "Calculation",
    "Diagnostic",
    "calculations_for",
    "evaluate_all",
]
