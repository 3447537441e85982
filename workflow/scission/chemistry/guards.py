"""Bounds that no sound calculation passes, and the spin it must have."""

from __future__ import annotations

from scission.solution import Solution

ENERGY_ROOM = 1e-6
"""How far (hartree) convergence alone may carry an energy across a bound."""

SPIN_ROOM = 1e-3


def violation(
    solution: Solution, upper_bounds: dict[str, float], lower_bounds: dict[str, float]
) -> tuple[str, str] | None:
    """Return (reason, message) of the first rule that a converged solution breaks, or ``None``.

    ``upper_bounds`` are energies (hartree) by name that a variational solution cannot lie above: every
    determinant of the space it minimises over; ``lower_bounds`` those it cannot lie below.
    """
    if not solution.converged:
        return None
    spin = _wrong_spin(solution)
    if spin:
        return "spin", spin
    for name, bound in upper_bounds.items():
        if solution.energy > bound + ENERGY_ROOM:
            words = f"energy {solution.energy:.8f} hartree lies above that of the {name}, {bound:.8f}"
            return "bound-violated", f"{words}: a higher solution"
    for name, bound in lower_bounds.items():
        if solution.energy < bound - ENERGY_ROOM:
            words = f"energy {solution.energy:.8f} hartree lies below that of {name}, {bound:.8f}"
            return "bound-violated", f"{words}: a variational energy cannot"
    return None


def _wrong_spin(solution: Solution) -> str:
    """Return what is wrong with the spin of a state whose spin is fixed, or nothing."""
    fixed = solution.reference == "CASSCF" or solution.correlation == "FCI"
    expected = solution.spin * (solution.spin + 1.0)
    if not fixed or solution.s2 is None or abs(solution.s2 - expected) < SPIN_ROOM:
        return ""
    return f"<S^2> is {solution.s2:.4f}, the state asked for has {expected:.4f}"
