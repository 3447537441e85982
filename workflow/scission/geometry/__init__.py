"""Geometries of a scan: one file a kind of coordinate, one registry.

Contract for a new kind of coordinate
-------------------------------------
A member is a function ``kind(molecule, block) -> ScanPath``.  ``molecule`` has ``symbols``
(n_atoms names), ``positions`` (n_atoms, 3) in bohr and ``unit``; ``block`` is what the scan holds under
the registry's key (a field of that name in ``campaign.model.Scan``).  The function

* builds every geometry of the scan, in the order of the block, without changing its input;
* leaves atoms that the coordinate does not move exactly where the molecule has them;
* puts coordinate values in angstrom into ``values``, one column a name in ``names``;
* raises ``GeometryError`` with every fault of the block at once, each with its place inside the
  block, its value and a rule that says what to do.
"""

from collections.abc import Callable, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from scission.geometry.path import Fault, GeometryError, ScanPath
from scission.geometry.stretch import bond_atoms, expected_length, stretch
from scission.units import ANGSTROM_IN_BOHR, BOHR_IN_ANGSTROM

if TYPE_CHECKING:
    from scission.campaign.model import Molecule, Scan

COORDINATES: dict[str, Callable[..., ScanPath]] = {"stretch": stretch}

__all__ = [
    "COORDINATES",
    "Fault",
    "GeometryError",
    "ScanPath",
    "build_path",
    "equilibrium_guess_angstrom",
    "path_at",
]


def build_path(molecule: "Molecule", scan: "Scan") -> ScanPath:
    """All geometries of a scan.

    Raises
    ------
    GeometryError
        Places in its faults start at the scan: ``("stretch", "bond", 1)``.
    """
    kind, block = _coordinate(scan)
    try:
        return COORDINATES[kind](molecule, block)
    except GeometryError as error:
        raise GeometryError([replace(f, where=(kind, *f.where)) for f in error.faults]) from error


def path_at(molecule: "Molecule", scan: "Scan", lengths_angstrom: Sequence[float]) -> ScanPath:
    """The same coordinate at other lengths (angstrom), to bridge gaps of the scan's own grid."""
    block = scan.stretch
    if block is None:
        raise GeometryError([Fault((), None, "only a stretched bond can be extended to other lengths")])
    unit = 1.0 if molecule.unit == "angstrom" else ANGSTROM_IN_BOHR
    lengths = [float(x) * unit for x in lengths_angstrom]
    return stretch(molecule, block.model_copy(update={"lengths": lengths}))


def equilibrium_guess_angstrom(molecule: "Molecule", scan: "Scan") -> float:
    """Where the minimum along the coordinate is expected, angstrom."""
    block = scan.stretch
    if block is None:
        raise GeometryError([Fault((), None, "only a stretched bond has an expected length")])
    return expected_length(molecule, bond_atoms(molecule, block)) * BOHR_IN_ANGSTROM


def _coordinate(scan: "Scan") -> tuple[str, Any]:
    given = {kind: block for kind in COORDINATES if (block := getattr(scan, kind)) is not None}
    if len(given) != 1:
        rule = f"needs exactly one coordinate ({', '.join(COORDINATES)})"
        raise GeometryError([Fault((), list(given), rule)])
    return next(iter(given.items()))
