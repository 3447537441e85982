"""Isotope masses and the reduced mass of a stretched bond.

The table ``isotopes.csv`` beside this module holds the most abundant isotope of each
element from H to Lr (AME2020).  Inside the library a mass is in electron masses.
"""

import csv
from collections.abc import Sequence
from functools import cache
from importlib import resources

from scission.units import DALTON_IN_ELECTRON_MASS


@cache
def _masses_dalton() -> dict[str, float]:
    text = resources.files("scission").joinpath("isotopes.csv").read_text(encoding="utf-8")
    lines = [line for line in text.splitlines() if not line.startswith("#")]
    return {row["element"]: float(row["mass_dalton"]) for row in csv.DictReader(lines)}


def isotope_mass(element: str) -> float:
    """Mass of the most abundant isotope of an element, in electron masses.

    Raises:
        ValueError: the element is not in the table (H to Lr, written like ``Cl``).
    """
    masses = _masses_dalton()
    if element not in masses:
        raise ValueError(f"isotope_mass: {element!r} is not an element symbol of the mass table (H to Lr)")
    return masses[element] * DALTON_IN_ELECTRON_MASS


def reduced_mass(first: Sequence[str], second: Sequence[str]) -> float:
    """Reduced mass of two fragments that move against each other, in electron masses.

    Each fragment is a sequence of element symbols and counts as one rigid body with the
    sum of its isotope masses: exact for a diatomic, a model for a polyatomic.

    Raises:
        ValueError: a fragment has no atoms, or an element is not in the table.
    """
    if not first or not second:
        raise ValueError("reduced_mass: a fragment has no atoms; each side of the bond needs at least one")
    mass_a = sum(isotope_mass(element) for element in first)
    mass_b = sum(isotope_mass(element) for element in second)
    return mass_a * mass_b / (mass_a + mass_b)
