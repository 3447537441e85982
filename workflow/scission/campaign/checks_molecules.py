"""Each molecule by itself: its atoms, their places, and its charge and spin."""

import numpy as np

from scission import units
from scission.campaign.electrons import all_electrons
from scission.campaign.model import Molecule
from scission.campaign.parts import Parts
from scission.campaign.problems import Problem
from scission.campaign.xyz import parse_atoms, read_xyz, xyz_missing
from scission.geometry.labels import label

CLOSEST_ANGSTROM = 0.1
"""Atoms nearer than this are taken for a mistake: the shortest bond, in hydrogen, is 0.74 angstrom."""


def check_molecules(parts: Parts) -> list[Problem]:
    """Places the atoms of every molecule; those that cannot be placed are taken out of ``parts``."""
    problems = []
    for name, molecule in list(parts.molecules.items()):
        path = f"molecules.{name}"
        misplaced = _place(molecule, parts, path)
        if misplaced:
            del parts.molecules[name]
            problems += misplaced
            continue
        crowded, spin = _coinciding(molecule, path), _spin(molecule, path)
        parts.crowded_molecules |= {name} if crowded else set()
        parts.sound_molecules |= {name} if not crowded and not spin else set()
        problems += crowded + spin
    return problems


def _place(molecule: Molecule, parts: Parts, path: str) -> list[Problem]:
    if molecule.atoms is not None and molecule.xyz is None:
        symbols, positions, problems = parse_atoms(molecule.atoms, molecule.unit, f"{path}.atoms")
    elif molecule.xyz is not None and molecule.atoms is None:
        symbols, positions, problems = read_xyz(molecule.xyz, parts.directory, f"{path}.xyz")
    else:
        return xyz_missing(molecule.atoms, molecule.xyz, path)
    if not problems:
        molecule.place(symbols, positions)
    return problems


def _coinciding(molecule: Molecule, path: str) -> list[Problem]:
    positions = molecule.positions * units.BOHR_IN_ANGSTROM
    distances = np.linalg.norm(positions[:, None] - positions[None, :], axis=2)
    problems = []
    for first, second in np.argwhere(np.triu(distances < CLOSEST_ANGSTROM, k=1)):
        pair = f"{label(molecule.symbols, first)}, {label(molecule.symbols, second)}"
        rule = (
            f"lie {distances[first, second]:.3g} angstrom apart, nearer than {CLOSEST_ANGSTROM} angstrom: "
            "is one atom written twice, or the unit wrong?"
        )
        source = "xyz" if molecule.xyz else "atoms"
        problems.append(Problem(f"{path}.{source}", pair, rule))
    return problems


def _spin(molecule: Molecule, path: str) -> list[Problem]:
    """Charge and multiplicity against the number of electrons."""
    electrons = all_electrons(molecule)
    unpaired = molecule.multiplicity - 1
    if electrons < 1:
        rule = f"leaves {electrons} electrons: at least one is needed"
        return [Problem(f"{path}.charge", molecule.charge, rule)]
    if unpaired > electrons:
        rule = f"needs {unpaired} unpaired electrons, and there are {electrons} (charge {molecule.charge})"
        return [Problem(f"{path}.multiplicity", molecule.multiplicity, rule)]
    if (electrons - unpaired) % 2:
        kind = "odd (1, 3, ...)" if electrons % 2 == 0 else "even (2, 4, ...)"
        rule = f"does not fit {electrons} electrons (charge {molecule.charge}): it must be {kind}"
        return [Problem(f"{path}.multiplicity", molecule.multiplicity, rule)]
    return []
