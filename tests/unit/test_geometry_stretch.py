"""Stretching a bond: which atoms move, how far, and what stays exactly in place."""

import numpy as np
import pytest
from numpy.typing import NDArray
from scission import units
from scission.campaign import Molecule, Scan
from scission.geometry import GeometryError, ScanPath, build_path
from scission.geometry.radii import RADII_ANGSTROM, bonded

METHANOL = """
C  -0.0469  0.6620  0.0000
O  -0.0469 -0.7588  0.0000
H  -1.0864  0.9772  0.0000
H   0.4379  1.0714  0.8892
H   0.4379  1.0714 -0.8892
H   0.8633 -1.0566  0.0000
"""
WATER = "O 0 0 0.1173\nH 0 0.7572 -0.4692\nH 0 -0.7572 -0.4692"


def _molecule(atoms: str, unit: str = "angstrom") -> Molecule:
    return Molecule.model_validate({"charge": 0, "multiplicity": 1, "unit": unit, "atoms": atoms})


def _path(atoms: str, bond: list[str], lengths: object, unit: str = "angstrom", **more: object) -> ScanPath:
    stretch = {"bond": bond, "lengths": lengths, **more}
    scan = Scan.model_validate({"molecule": "m", "levels": ["l"], "stretch": stretch})
    return build_path(_molecule(atoms, unit), scan)


def _distances(positions: NDArray[np.float64]) -> NDArray[np.float64]:
    return np.linalg.norm(positions[:, None] - positions[None, :], axis=2)


def test_the_bond_has_the_lengths_asked_for() -> None:
    """At each point the two atoms are as far apart as the coordinate says."""
    lengths = [0.7, 1.0, 2.5, 10.0]
    path = _path(WATER, ["O1", "H2"], lengths)
    apart = np.linalg.norm(path.positions[:, 1] - path.positions[:, 0], axis=1) * units.BOHR_IN_ANGSTROM

    assert path.names == ("O1-H2 distance",)
    assert path.values[:, 0].tolist() == lengths
    assert apart == pytest.approx(lengths, abs=1e-12)


@pytest.mark.parametrize(
    ("bond", "moved"),
    [
        (["C1", "O2"], (1, 5)),
        (["O2", "C1"], (0, 2, 3, 4)),
        (["O2", "H6"], (5,)),
        (["H3", "C1"], (0, 1, 3, 4, 5)),
    ],
)
def test_the_side_of_the_second_atom_moves(bond: list[str], moved: tuple[int, ...]) -> None:
    """In methanol the atoms connected with the second atom named move, and no others."""
    path = _path(METHANOL, bond, [1.0, 2.0])

    assert path.fragments == (tuple(a for a in range(6) if a not in moved), moved)


def test_fragments_are_rigid_and_the_rest_stays_exactly() -> None:
    """Distances inside the moved fragment do not change; fixed atoms keep their bits."""
    path = _path(METHANOL, ["C1", "O2"], [1.2, 1.4208, 5.0])
    given = _molecule(METHANOL).positions
    fixed, moved = (list(fragment) for fragment in path.fragments)

    for positions in path.positions:
        assert np.array_equal(positions[fixed], given[fixed])
        assert _distances(positions[moved]) == pytest.approx(_distances(given[moved]), abs=1e-12)


def test_the_moved_atoms_shift_along_the_bond() -> None:
    """Every moved atom is displaced by the same vector, parallel to the bond."""
    path = _path(METHANOL, ["C1", "O2"], [5.0])
    given = _molecule(METHANOL).positions
    shifts = (path.positions[0] - given)[list(path.fragments[1])]
    bond = given[1] - given[0]

    assert shifts == pytest.approx(np.tile(shifts[0], (2, 1)), abs=1e-12)
    assert np.cross(shifts[0], bond) == pytest.approx(np.zeros(3), abs=1e-12)


def test_move_overrides_the_connectivity() -> None:
    """With move the atoms listed move, also if that is the first atom's side."""
    path = _path(METHANOL, ["C1", "O2"], [3.0], move=["C1", "H3"])
    apart = np.linalg.norm(path.positions[0, 1] - path.positions[0, 0]) * units.BOHR_IN_ANGSTROM

    assert path.fragments == ((1, 3, 4, 5), (0, 2))
    assert apart == pytest.approx(3.0, abs=1e-12)


def test_a_bond_in_a_ring_is_an_error_that_move_lifts() -> None:
    """In ozone with a third bond no side is free; with move one atom is."""
    ring = "O 0 0 0\nO 1.4 0 0\nO 0.7 1.2 0"
    with pytest.raises(GeometryError, match=r"part of a ring.*move: \[O2\]"):
        _path(ring, ["O1", "O2"], [1.5])

    assert _path(ring, ["O1", "O2"], [1.5], move=["O2"]).fragments == ((0, 2), (1,))


def test_a_molecule_given_stretched_is_stretched_further() -> None:
    """The bond named counts as one at any length of the geometry given."""
    path = _path("H 0 0 0\nF 0 0 6.0", ["H1", "F2"], [0.9, 8.0])

    assert path.positions[:, 1, 2] * units.BOHR_IN_ANGSTROM == pytest.approx([0.9, 8.0], abs=1e-12)


def test_a_further_molecule_stays() -> None:
    """Atoms bonded to neither side stay where they are."""
    path = _path("H 0 0 0\nF 0 0 0.917\nHe 0 0 5.0", ["H1", "F2"], [2.0])

    assert path.fragments == ((0, 2), (1,))


def test_lengths_are_in_the_unit_of_the_molecule() -> None:
    """In bohr the geometry has the lengths as given, and the coordinate is their value in angstrom."""
    path = _path("H 0 0 0\nH 0 0 1.4", ["H1", "H2"], [1.0, 1.4], unit="bohr")

    assert path.positions[:, 1, 2] == pytest.approx([1.0, 1.4], abs=1e-14)
    assert path.values[:, 0] == pytest.approx([0.529177, 0.740848], abs=1e-6)


def test_the_molecule_is_left_alone() -> None:
    """Building a path does not change the molecule, and its positions cannot be written."""
    molecule = _molecule(WATER)

    with pytest.raises(ValueError, match="read-only"):
        molecule.positions[0, 0] = 1.0


def test_bonds_of_common_molecules() -> None:
    """Connectivity finds the bonds of methanol and no others."""
    molecule = _molecule(METHANOL)
    pairs = np.argwhere(np.triu(bonded(molecule.symbols, molecule.positions))).tolist()

    assert pairs == [[0, 1], [0, 2], [0, 3], [0, 4], [1, 5]]


@pytest.mark.parametrize(
    ("symbol", "radius"), [("H", 0.31), ("C", 0.76), ("N", 0.71), ("O", 0.66), ("F", 0.57)]
)
def test_radii(symbol: str, radius: float) -> None:
    """Radii in angstrom of Cordero et al., Dalton Trans. 2008, 2832, table 2 (from memory)."""
    assert RADII_ANGSTROM[symbol] == radius


def test_every_fault_of_a_bond_comes_at_once() -> None:
    """Both labels are checked, and places start at the scan."""
    with pytest.raises(GeometryError) as caught:
        _path(WATER, ["H1", "H9"], [1.0])

    assert [fault.where for fault in caught.value.faults] == [("stretch", "bond", 0), ("stretch", "bond", 1)]
