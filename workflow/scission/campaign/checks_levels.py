"""Each level by itself: does the combination of methods make sense, and are its names known?"""

import re

from scission.campaign.model import PICTURES, ActiveSpace, Level
from scission.campaign.names import (
    ELEMENTS,
    basis_like,
    element_like,
    functional_like,
    is_basis,
    is_functional,
)
from scission.campaign.parts import Parts
from scission.campaign.problems import MISSING, Problem

HARTREE_FOCK = ("RHF", "UHF", "ROHF")
KOHN_SHAM = ("RKS", "UKS")
ORBITAL = re.compile(r"([A-Z][a-z]?)([1-9][0-9]*)? +([1-7][spdfg])\Z")
"""``N 2p`` or ``N1 2p``: element, number of the atom (all atoms of the element without), shell."""


def check_levels(parts: Parts) -> list[Problem]:
    """Every level of the campaign."""
    problems = []
    for name, level in parts.levels.items():
        path = f"levels.{name}"
        problems += _correlation(level, path) + _functional(level, path)
        problems += _active_space(level, path) + _basis(level, path)
    return problems


def _correlation(level: Level, path: str) -> list[Problem]:
    method, reference = level.correlation, level.reference
    rule = ""
    if reference in PICTURES and method != "none":
        rule = f"does not go on {reference}: the pictures of the bond take none"
    elif method == "NEVPT2" and reference != "CASSCF":
        rule = f"needs a CASSCF reference, and this level has {reference}"
    elif reference == "CASSCF" and method not in ("none", "NEVPT2"):
        rule = "does not go on CASSCF, which takes none or NEVPT2"
    elif reference in KOHN_SHAM and method != "none":
        rule = f"does not go on {reference}: it needs {', '.join(HARTREE_FOCK)} (NEVPT2: CASSCF)"
    return [Problem(f"{path}.correlation", method, rule)] if rule else []


def _functional(level: Level, path: str) -> list[Problem]:
    path = f"{path}.functional"
    if level.reference in KOHN_SHAM and level.functional is None:
        return [Problem(path, MISSING, f"is missing, and {level.reference} needs one")]
    if level.functional is None:
        return []
    if level.reference not in KOHN_SHAM:
        rule = f"does not go with {level.reference}: only RKS and UKS take a functional"
        return [Problem(path, level.functional, rule)]
    if not is_functional(level.functional):
        rule = "is not a known functional (a name such as PBE0, or exchange,correlation such as PBE,PBE)"
        return [Problem(path, level.functional, rule + functional_like(level.functional))]
    return []


def _active_space(level: Level, path: str) -> list[Problem]:
    space, problems = level.active_space, []
    if level.reference != "CASSCF":
        if space is not None:
            shown = space.model_dump(exclude_none=True) if isinstance(space, ActiveSpace) else space
            rule = f"does not go with {level.reference}: only CASSCF has an active space"
            problems.append(Problem(f"{path}.active_space", shown, rule))
        if level.states > 1:
            rule = f"states need CASSCF, and this level has {level.reference}"
            problems.append(Problem(f"{path}.states", level.states, rule))
    elif space is None:
        rule = "is missing, and CASSCF needs one: auto or {electrons: ..., orbitals: ...}"
        problems.append(Problem(f"{path}.active_space", MISSING, rule))
    elif isinstance(space, ActiveSpace):
        problems += _orbitals(space, f"{path}.active_space")
    return problems


def _orbitals(space: ActiveSpace, path: str) -> list[Problem]:
    """Electrons against orbitals, and the spelling of atomic orbitals."""
    problems = []
    if space.electrons > 2 * space.orbitals:
        rule = f"electrons do not fit in {space.orbitals} orbitals: at most two in each"
        problems.append(Problem(f"{path}.electrons", space.electrons, rule))
    for place, text in enumerate(space.atomic_orbitals or []):
        match = ORBITAL.match(text)
        if match is None or match[1] not in ELEMENTS:
            rule = "is not an atomic orbital: element (and number of the atom), shell: 'N 2p', 'N1 2p'"
            problems.append(Problem(f"{path}.atomic_orbitals[{place}]", text, rule))
    return problems


def _basis(level: Level, path: str) -> list[Problem]:
    path = f"{path}.basis"
    if isinstance(level.basis, str):
        return _unknown_basis(level.basis, path)
    problems = []
    for element, name in level.basis.items():
        if element not in ELEMENTS and element != "default":
            rule = f"is not an element (or default){element_like(element)}"
            problems.append(Problem(f"{path}.{element}", element, rule))
        problems += _unknown_basis(name, f"{path}.{element}")
    return problems


def _unknown_basis(name: str, path: str) -> list[Problem]:
    if is_basis(name):
        return []
    rule = f"is not a basis that PySCF or the Basis Set Exchange knows{basis_like(name)}"
    return [Problem(path, name, rule)]
