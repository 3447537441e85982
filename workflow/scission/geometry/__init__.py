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

from collections.abc import Callable
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from scission.geometry.path import Fault, GeometryError, ScanPath
from scission.geometry.stretch import stretch

if TYPE_CHECKING:
    from scission.campaign.model import Molecule, Scan

COORDINATES: dict[str, Callable[..., ScanPath]] = {"stretch": stretch}

__all__ = ["COORDINATES", "Fault", "GeometryError", "ScanPath", "build_path"]


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


def _coordinate(scan: "Scan") -> tuple[str, Any]:
    given = {kind: block for kind in COORDINATES if (block := getattr(scan, kind)) is not None}
    if len(given) != 1:
        rule = f"needs exactly one coordinate ({', '.join(COORDINATES)})"
        raise GeometryError([Fault((), list(given), rule)])
    return next(iter(given.items()))
