"""What decides the numbers of a point, and the key made from it.

A key covers geometry, charge, multiplicity, level, options of the calculation and the physics version;
neither names of scans nor grids, thresholds or fits.  So adding points or levels never changes a key.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from scission.campaign import Level, Molecule
from scission.physics import PHYSICS_VERSION

_ROUNDING_DECIMALS = 8
"""Positions closer than this (bohr) are one geometry: far below any effect on a converged energy."""


def digest(text: str | bytes) -> str:
    """Return the first 20 hexadecimal digits of the SHA-256 of ``text``."""
    raw = text if isinstance(text, bytes) else text.encode("utf-8")
    return hashlib.sha256(raw).hexdigest()[:20]


def canonical(data: Any) -> str:
    """Return ``data`` as JSON with one spelling only: sorted keys, no blanks."""
    return json.dumps(data, sort_keys=True, separators=(",", ":"))


def reference_spec(level: Level, molecule: Molecule) -> dict[str, Any]:
    """Return what a level says of its reference wavefunction: levels with equal specs share it."""
    spec: dict[str, Any] = {
        "reference": level.reference,
        "functional": level.functional.strip().lower() if level.functional else None,
        "basis": {e: (level.basis_of(e) or "").strip().lower() for e in sorted(set(molecule.symbols))},
        "follow": level.resolved_follow,
    }
    if level.reference == "CASSCF":
        space = level.active_space
        spec["active_space"] = space if isinstance(space, str) else space.model_dump() if space else None
        spec["states"] = level.states
    return spec


def reference_key(
    molecule: dict[str, Any],
    spec: dict[str, Any],
    bonds: Sequence[Sequence[int]],
    positions: NDArray[np.float64],
) -> str:
    """Return the key of a reference wavefunction at ``positions`` ((n_atoms, 3), bohr)."""
    return reference_keys(molecule, spec, bonds, np.asarray(positions)[None])[0]


def reference_keys(
    molecule: dict[str, Any],
    spec: dict[str, Any],
    bonds: Sequence[Sequence[int]],
    positions: NDArray[np.float64],
) -> list[str]:
    """Return the keys of a reference wavefunction at several geometries ((n_points, n_atoms, 3), bohr).

    The stretched bonds count only where they decide the active space.
    """
    choice = [list(b) for b in bonds] if "active_space" in spec else None
    head = canonical([PHYSICS_VERSION, "reference", molecule, spec, choice]).encode()
    return [digest(head + geometry.tobytes()) for geometry in _rounded(positions)]


def point_key(reference: str, correlation: str, frozen_core: bool) -> str:
    """Return the key of a point: its reference's key and what is done on top."""
    return point_keys([reference], correlation, frozen_core)[0]


def point_keys(references: Sequence[str], correlation: str, frozen_core: bool) -> list[str]:
    """Return the keys of points on several references, in their order."""
    frozen = frozen_core if correlation not in ("none", "NEVPT2") else None
    before, after = canonical([PHYSICS_VERSION, "point", "@", correlation, frozen]).split("@")
    return [digest(f"{before}{reference}{after}") for reference in references]


def geometry_bytes(positions: NDArray[np.float64]) -> bytes:
    """Return positions (bohr), rounded, as the bytes that go into a key."""
    return _rounded(positions).tobytes()


def _rounded(positions: NDArray[np.float64]) -> NDArray[np.float64]:
    rounded = np.round(positions, _ROUNDING_DECIMALS) + 0.0  # adding zero turns -0.0 into 0.0
    return rounded.astype("<f8")
