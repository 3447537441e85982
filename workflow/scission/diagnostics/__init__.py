"""Wavefunction diagnostics: from a :class:`scission.solution.Solution` to one number each.

Contract for a new member
-------------------------
1. Write a function ``evaluate(solution) -> float | Absent`` in the file of its family (or a new file).  Its
   docstring states formula, unit, shapes, source.  It must not depend on the phases or order of degenerate
   orbitals, must be finite, and must say itself (``Absent(reason)``) when it is not meaningful for the
   solution it is given: it never returns zero for "unknown" and never raises for a valid solution.
2. Add a :class:`Diagnostic` to ``DIAGNOSTICS`` below.  The key is the name used in records and tables.
3. If it has a published threshold, add it to :mod:`scission.thresholds`, with its source.

Every member inherits the tests in ``tests/contract/test_diagnostics.py``.
"""

from __future__ import annotations

from scission.solution import Solution

from . import amplitudes, frontier, occupations, spin
from .types import Absent, Diagnostic

DIAGNOSTICS: dict[str, Diagnostic] = {
    d.name: d
    for d in (
        Diagnostic("t1", "T1", "1", "norm of the singles amplitudes per correlated electron", amplitudes.LEE_TAYLOR, amplitudes.t1),
        Diagnostic("d1", "D1", "1", "largest singular value of the singles amplitudes", amplitudes.JANSSEN_NIELSEN, amplitudes.d1),
        Diagnostic("d2", "D2", "1", "largest singular value of the doubles amplitudes", amplitudes.NIELSEN_JANSSEN, amplitudes.d2),
        Diagnostic("largest_t2", "max |t2|", "1", "largest doubles amplitude", "common practice, no source", amplitudes.largest_t2),
        Diagnostic("triples_share", "(T) share", "%", "share of (T) in the correlation energy", "common practice, no source", amplitudes.triples_share),
        Diagnostic("s2", "<S^2>", "1", "expectation value of the total spin squared", "textbook definition", spin.s2),
        Diagnostic("s2_excess", "<S^2> excess", "1", "<S^2> - S(S+1) of the state asked for", "textbook definition", spin.s2_excess),
        Diagnostic("uhf_hono", "UHF HONO", "1", "occupation of the last strongly occupied unrestricted natural orbital", occupations.PULAY_HAMILTON, occupations.uhf_hono),
        Diagnostic("uhf_luno", "UHF LUNO", "1", "occupation of the first weakly occupied unrestricted natural orbital", occupations.PULAY_HAMILTON, occupations.uhf_luno),
        Diagnostic("triplet_stability", "triplet stability", "hartree", "lowest eigenvalue of the restricted determinant's triplet stability matrix", spin.SEEGER_POPLE, spin.triplet_stability),
        Diagnostic("hono", "HONO", "1", "occupation of the last strongly occupied natural orbital of the active space", "textbook definition", occupations.hono),
        Diagnostic("luno", "LUNO", "1", "occupation of the first weakly occupied natural orbital of the active space", "textbook definition", occupations.luno),
        Diagnostic("c0_squared", "C0^2", "1", "weight of the leading configuration in natural orbitals", "common practice, no source", occupations.c0_squared),
        Diagnostic("homo_lumo_gap", "HOMO-LUMO gap", "hartree", "smallest gap between occupied and empty orbitals of the reference", "textbook definition", frontier.homo_lumo_gap),
    )
}


def evaluate_all(solution: Solution) -> tuple[dict[str, float], dict[str, str]]:
    """Return the values of every diagnostic that is meaningful for ``solution``, and why others are not."""
    values: dict[str, float] = {}
    absent: dict[str, str] = {}
    for name, diagnostic in DIAGNOSTICS.items():
        result = diagnostic.evaluate(solution)
        if isinstance(result, Absent):
            absent[name] = result.reason
        else:
            values[name] = float(result)
    return values, absent


__all__ = ["DIAGNOSTICS", "Absent", "Diagnostic", "evaluate_all"]
