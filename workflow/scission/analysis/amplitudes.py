"""Coupled-cluster solutions that do not belong to the same curve as their neighbours.

Coupled-cluster equations have several solutions, and converged amplitudes prove nothing by themselves.  What the
amplitudes excite into changes slowly along a curve; where it does not, the two points hold different solutions.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable
from typing import Any

import numpy as np

from scission.records import Store, recall
from scission.records.recall import Planned

UNLIKE = 0.6
"""Below this overlap of neighbours the solutions differ.  On closed shells neighbours of 25-point grids have 0.97
and more, on broken-symmetry references, whose virtual orbitals are nearly degenerate in pairs, 0.78 and more
(own measurement on N2, HF and F2)."""


def amplitude_steps(points: Iterable[Planned], store: Store) -> dict[tuple[str, str], list[dict[str, Any]]]:
    """Return, by scan and level, rows of the crossings table where the amplitudes change their solution."""
    levels: dict[tuple[str, str], list[Planned]] = defaultdict(list)
    for point in points:
        levels[point.scan, point.level].append(point)
    found = {}
    for group, members in levels.items():
        first = recall(store, members[0].key)
        if first.inputs.get("correlation", "CCSD") in ("CCSD", "CCSD(T)"):
            found[group] = _steps(sorted(members, key=lambda p: p.number), store)
    return {group: rows for group, rows in found.items() if rows}


def _steps(members: list[Planned], store: Store) -> list[dict[str, Any]]:
    rows = []
    before: tuple[Planned, np.ndarray, float] | None = None
    for point in members:
        record = recall(store, point.key, ("amplitude_orbitals",))
        shape = record.arrays.get("amplitude_orbitals")
        if record.status != "converged" or shape is None:
            continue
        energy = float(record.scalars["energy"])
        if before is not None and (overlap := density_overlap(before[1], shape)) < UNLIKE:
            rows.append(
                {
                    "from_angstrom": before[0].coordinate[0],
                    "to_angstrom": point.coordinate[0],
                    "overlap": overlap,
                    "energy_step_hartree": energy - before[2],
                    "what": "the coupled-cluster amplitudes belong to another solution on the other side; "
                    "retry the points farther from the minimum with the remedy 'neighbour'",
                }
            )
        before = point, shape, energy
    return rows


def density_overlap(a: np.ndarray, b: np.ndarray) -> float:
    """Return how alike two virtual densities are, 0 to 1.

    ``a`` and ``b`` are (rank, n_ao) natural orbitals scaled by the roots of their occupations, so that a density is
    a^T a; the result is tr(AB) / sqrt(tr(AA) tr(BB)).
    """

    def product(x: np.ndarray, y: np.ndarray) -> float:
        return float(np.sum((x @ y.T) ** 2))

    norm = float(np.sqrt(product(a, a) * product(b, b)))
    return product(a, b) / norm if norm > 0 else 1.0
