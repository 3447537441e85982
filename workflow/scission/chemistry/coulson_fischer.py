"""The Coulson-Fischer distance: where a restricted determinant becomes unstable, by root finding.

Coulson and Fischer, Philos. Mag. 40, 386 (1949).  Between two points of a scan at which the lowest triplet
stability eigenvalue has opposite signs, a few small calculations on carried orbitals find its zero.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from scipy.optimize import brentq

from scission.records.store import Record, Store
from scission.units import ANGSTROM_IN_BOHR

from . import scf
from .molecule import build_mole
from .recording import Stopwatch
from .stability import triplet_instability
from .starts import carried

TOLERANCE_ANGSTROM = 1e-4
SCALAR = "coulson_fischer"


class _LostError(RuntimeError):
    """A determinant between the two points did not converge, or has another occupation."""


def add_coulson_fischer(task: dict[str, Any], store: Store, _: Stopwatch) -> Record:
    """Return the record ``task["key"]`` with the distance as a scalar (bohr) and a remark in words.

    ``task`` has ``partner`` (key of the neighbouring point on the other side of the zero), ``coordinates`` (the
    two lengths, angstrom), ``positions`` and ``partner_positions`` ((n_atoms, 3), bohr), ``molecule``, ``spec``.
    Where the determinants in between cannot be followed, only the remark says so.

    Raises:
        RuntimeError: one of the two records is missing.
    """
    first, second = (store.read("reference", key) for key in (task["key"], task["partner"]))
    if first is None or second is None:
        raise RuntimeError(f"reference records {task['key']} and {task['partner']} must both be there")
    low, high = task["coordinates"]
    try:
        length, steps = _root(task, first, second)
    except _LostError as lost:
        first.notes[SCALAR] = (
            f"no zero of the triplet stability found between {low:.4f} and {high:.4f} angstrom: {lost}"
        )
        return first
    first.scalars[SCALAR] = length * ANGSTROM_IN_BOHR
    first.notes[SCALAR] = (
        f"the restricted determinant turns unstable at {length:.4f} angstrom "
        f"(root finding with {steps} calculations between {low:.4f} and {high:.4f})"
    )
    return first


def _root(task: dict[str, Any], first: Record, second: Record) -> tuple[float, int]:
    """Return the length, angstrom, and how many calculations it took."""
    low, high = task["coordinates"]
    ends = np.array(task["positions"]), np.array(task["partner_positions"])
    known = {0.0: first.diagnostics["triplet_stability"], 1.0: second.diagnostics["triplet_stability"]}

    def eigenvalue(share: float) -> float:
        if share not in known:
            parent = first if share < 0.5 else second
            known[share] = _eigenvalue(task, parent, (1.0 - share) * ends[0] + share * ends[1])
        return known[share]

    share = float(brentq(eigenvalue, 0.0, 1.0, xtol=TOLERANCE_ANGSTROM / abs(high - low)))
    return (1.0 - share) * low + share * high, len(known) - 2


def _eigenvalue(task: dict[str, Any], parent: Record, positions: np.ndarray) -> float:
    """Return the lowest triplet stability eigenvalue (hartree) at ``positions``, on the parent's state."""
    mole = build_mole(task["molecule"], task["spec"]["basis"], positions)
    field = scf.converge(scf.build_field(mole, task["spec"]), carried(parent, mole).density())
    if not field.converged:
        raise _LostError("a determinant in between did not converge")
    return triplet_instability(field)[0]
