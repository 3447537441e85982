"""The stretch of one bond: the atoms on one side of it move along it as a rigid body."""

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from scission import units
from scission.geometry.fragments import moved_by_choice, moved_by_connectivity
from scission.geometry.labels import find_atom, label
from scission.geometry.path import Fault, GeometryError, ScanPath
from scission.geometry.radii import bonded, covalent_radius
from scission.geometry.spacing import even, graded

if TYPE_CHECKING:
    from scission.campaign.model import Molecule, Stretch

SHORTEST_BOHR = 1e-3
"""Below this distance of the bonded atoms there is no direction to stretch along."""


def stretch(molecule: "Molecule", block: "Stretch") -> ScanPath:
    """Geometries with the bond at each of its lengths.

    The side of the second atom named moves, by translation along the bond; with ``move`` the
    atoms listed there do.  All other atoms keep their coordinates exactly, also those of
    a further molecule that is bonded to neither side.  The bond counts as one even where the
    molecule is given with it stretched.

    Raises
    ------
    GeometryError
        The bond or ``move`` does not name atoms of the molecule, the bonded atoms coincide,
        or the bond is part of a ring and ``move`` is not given.
    """
    pair = bond_atoms(molecule, block)
    moved = _moved_atoms(molecule, block, pair)
    given = given_lengths(molecule, block, pair)
    lengths = given * _unit_in_bohr(molecule)
    staying, moving = (pair[1], pair[0]) if pair[0] in moved else pair
    bond = molecule.positions[moving] - molecule.positions[staying]
    length = np.linalg.norm(bond)
    positions = np.repeat(molecule.positions[None], len(lengths), axis=0)
    atoms = sorted(moved)
    positions[:, atoms] += ((lengths - length)[:, None] * (bond / length))[:, None, :]
    fixed = tuple(atom for atom in range(len(molecule.symbols)) if atom not in moved)
    names = [label(molecule.symbols, atom) for atom in pair]
    values = given if molecule.unit == "angstrom" else lengths * units.BOHR_IN_ANGSTROM
    return ScanPath(
        (f"{names[0]}-{names[1]} distance",), values[:, None], positions, (pair,), (fixed, tuple(atoms))
    )


def bond_atoms(molecule: "Molecule", block: "Stretch") -> tuple[int, int]:
    """0-based atoms of the bond.

    Raises
    ------
    GeometryError
        A label is wrong, both are the same atom, or the two atoms are at the same place.
    """
    found = [find_atom(text, molecule.symbols, ("bond", place)) for place, text in enumerate(block.bond)]
    faults = [fault for _, some in found for fault in some]
    first, second = found[0][0], found[1][0]
    if not faults and first == second:
        faults.append(Fault(("bond",), list(block.bond), "names the same atom twice: a bond has two"))
    elif (
        not faults and np.linalg.norm(molecule.positions[first] - molecule.positions[second]) < SHORTEST_BOHR
    ):
        rule = "is between atoms at the same place, so it has no direction: move one of them"
        faults.append(Fault(("bond",), list(block.bond), rule))
    if faults:
        raise GeometryError(faults)
    return first, second


def _moved_atoms(molecule: "Molecule", block: "Stretch", pair: tuple[int, int]) -> set[int]:
    if block.move is not None:
        return moved_by_choice(block.move, pair, molecule.symbols)
    return moved_by_connectivity(bonded(molecule.symbols, molecule.positions), pair, molecule.symbols)


def given_lengths(molecule: "Molecule", block: "Stretch", pair: tuple[int, int]) -> NDArray[np.float64]:
    """Bond lengths in the molecule's unit, shape (n_points,); the ends of a grid exactly as given."""
    grid = block.lengths
    if isinstance(grid, list):
        return np.array(grid, dtype=np.float64)
    if grid.spacing == "even":
        return even(grid.from_, grid.to, grid.points)
    centre = expected_length(molecule, pair) / _unit_in_bohr(molecule)
    return graded(grid.from_, grid.to, grid.points, centre)


def _unit_in_bohr(molecule: "Molecule") -> float:
    return units.ANGSTROM_IN_BOHR if molecule.unit == "angstrom" else 1.0


def expected_length(molecule: "Molecule", pair: tuple[int, int]) -> float:
    """Where the minimum is expected, bohr.

    The sum of the covalent radii, or the bond's length in the molecule as given where
    that is within 30 % of it: multiple bonds are shorter than the radii of single ones say.
    """
    total = sum(covalent_radius(molecule.symbols[atom]) for atom in pair)
    given = float(np.linalg.norm(molecule.positions[pair[0]] - molecule.positions[pair[1]]))
    return given if 0.7 * total <= given <= 1.3 * total else total
