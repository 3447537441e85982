"""Each level on each molecule it is used for: spin, basis, electrons, active space, size."""

from collections.abc import Iterator

from scission.campaign.checks_levels import ORBITAL
from scission.campaign.electrons import Counts, atom_bases, configurations, count, determinants
from scission.campaign.model import PICTURES, ActiveSpace, Level, Molecule
from scission.campaign.names import is_basis
from scission.campaign.parts import Parts
from scission.campaign.problems import Problem
from scission.geometry.labels import find_atom

MOST_FCI_DETERMINANTS = 50_000_000
"""A vector of this length takes 0.4 GB, and the solver holds a dozen."""

MOST_CAS_DETERMINANTS = determinants(16, 8, 8)
"""16 electrons in 16 orbitals, about the most a conventional solver takes (common practice, no source)."""


def check_together(parts: Parts) -> list[Problem]:
    """Every pair of a molecule and a level that some scan uses, each pair once."""
    problems = []
    for use, molecule_name, level_name in _uses(parts):
        molecule, level = parts.molecules[molecule_name], parts.levels[level_name]
        problems += _spin(molecule, level, level_name, use)
        lacking = _lacking(molecule, level, f"levels.{level_name}.basis", molecule_name)
        counts = None if lacking else count(molecule, level)
        problems += lacking
        problems += _picture(molecule, level, counts, level_name, use)
        if counts is not None and counts.electrons >= counts.unpaired:
            problems += _sizes(counts, level, f"levels.{level_name}", molecule_name)
        problems += _atomic_orbitals(molecule, level, f"levels.{level_name}", molecule_name)
    return problems


def _uses(parts: Parts) -> Iterator[tuple[str, str, str]]:
    """Path of the first use, molecule and level of every pair whose blocks are well-formed."""
    seen = set()
    for scan_name, scan in parts.scans.items():
        for place, level in enumerate(scan.levels):
            pair = (scan.molecule, level)
            if pair not in seen and scan.molecule in parts.sound_molecules and level in parts.levels:
                seen.add(pair)
                yield (f"scans.{scan_name}.levels[{place}]", *pair)


def _spin(molecule: Molecule, level: Level, level_name: str, use: str) -> list[Problem]:
    if level.reference not in ("RHF", "RKS") or molecule.multiplicity == 1:
        return []
    open_shell = "UHF or ROHF" if level.reference == "RHF" else "UKS"
    rule = f"is {level.reference}, for singlets, and the molecule has multiplicity {molecule.multiplicity}"
    return [Problem(use, level_name, f"{rule}: use {open_shell}")]


def _picture(
    molecule: Molecule, level: Level, counts: Counts | None, level_name: str, use: str
) -> list[Problem]:
    """A picture of the bond is one of two electrons in a singlet between two atoms."""
    if level.reference not in PICTURES or counts is None:
        return []
    found = f"{counts.electrons} electrons outside ECP cores, {len(molecule.symbols)} atoms and multiplicity"
    if (counts.electrons, len(molecule.symbols), molecule.multiplicity) == (2, 2, 1):
        return []
    rule = f"is {level.reference}, for two electrons of a singlet between two atoms, and the molecule has "
    return [Problem(use, level_name, f"{rule}{found} {molecule.multiplicity}: take another level")]


def _lacking(molecule: Molecule, level: Level, path: str, molecule_name: str) -> list[Problem]:
    """Elements of the molecule without a basis; names that are unknown at all are reported elsewhere."""
    problems = []
    for symbol, basis in atom_bases(molecule, level).items():
        name = level.basis_of(symbol)
        if basis is None and (name is None or is_basis(name)):
            shown = level.basis if name is None else name
            rule = f"has no basis for {symbol}, which molecule {molecule_name!r} holds"
            problems.append(Problem(path, shown, f"{rule}: choose another, or give one per element"))
    return problems


def _sizes(counts: Counts, level: Level, path: str, molecule_name: str) -> list[Problem]:
    where = f"in molecule {molecule_name!r}"
    if counts.alpha > counts.functions:
        rule = f"has {counts.functions} functions {where}, too few for its {counts.electrons} electrons"
        return [Problem(f"{path}.basis", level.basis, rule)]
    if isinstance(level.active_space, ActiveSpace) and level.reference == "CASSCF":
        return _active_space(counts, level.active_space, level.states, f"{path}.active_space", where)
    if level.correlation in ("none", "NEVPT2"):
        return []
    return _correlated(counts, level, path, where)


def _correlated(counts: Counts, level: Level, path: str, where: str) -> list[Problem]:
    core = counts.core if level.frozen_core else 0
    if counts.beta < core or counts.alpha + counts.beta == 2 * core:
        rule = f"leaves no electrons to correlate {where}: set it to false"
        return [Problem(f"{path}.frozen_core", level.frozen_core, rule)]
    if counts.beta == counts.functions:
        rule = f"leaves no empty orbitals {where}, and {level.correlation} needs some: take a larger one"
        return [Problem(f"{path}.basis", level.basis, rule)]
    size = determinants(counts.functions - core, counts.alpha - core, counts.beta - core)
    if level.correlation == "FCI" and size > MOST_FCI_DETERMINANTS:
        rule = (
            f"means {size:.2g} determinants {where} ({counts.electrons - 2 * core} electrons in "
            f"{counts.functions - core} orbitals), more than {MOST_FCI_DETERMINANTS:.0e}: use fewer"
        )
        return [Problem(f"{path}.correlation", level.correlation, rule)]
    return []


def _active_space(counts: Counts, space: ActiveSpace, states: int, path: str, where: str) -> list[Problem]:
    rule = _misfit(counts, space)
    if rule:
        key = "orbitals" if rule.startswith("orbitals") else "electrons"
        return [Problem(f"{path}.{key}", getattr(space, key), f"{rule} {where}")]
    alpha = (space.electrons + counts.unpaired) // 2
    size = determinants(space.orbitals, alpha, space.electrons - alpha)
    if size > MOST_CAS_DETERMINANTS:
        rule = f"means {size:.2g} determinants {where}, more than 16 electrons in 16 orbitals do: take fewer"
        return [Problem(f"{path}.orbitals", space.orbitals, rule)]
    functions = configurations(space.orbitals, space.electrons, counts.unpaired)
    if states > functions:
        rule = f"states are more than the {functions} that the active space has {where}"
        return [Problem(path.replace("active_space", "states"), states, rule)]
    return []


def _misfit(counts: Counts, space: ActiveSpace) -> str:
    """What is wrong with the active space; "" where it fits, or is wrong by itself (checked elsewhere)."""
    if space.electrons > 2 * space.orbitals:
        return ""
    if space.electrons > counts.electrons:
        return f"electrons are more than the {counts.electrons} outside ECP cores"
    if (counts.electrons - space.electrons) % 2:
        parity = "even" if counts.electrons % 2 == 0 else "odd"
        return f"electrons leave an odd number in doubly occupied orbitals: it must be {parity}"
    if space.electrons < counts.unpaired:
        return f"electrons are fewer than the {counts.unpaired} unpaired ones"
    if (space.electrons + counts.unpaired) // 2 > space.orbitals:
        return f"orbitals are too few for {counts.unpaired} unpaired among {space.electrons} electrons"
    inactive = (counts.electrons - space.electrons) // 2
    if inactive + space.orbitals > counts.functions:
        return (
            f"orbitals and {inactive} doubly occupied ones are more than the basis has ({counts.functions})"
        )
    return ""


def _atomic_orbitals(molecule: Molecule, level: Level, path: str, molecule_name: str) -> list[Problem]:
    """Atoms that ``atomic_orbitals`` name are in the molecule."""
    space, problems = level.active_space, []
    texts = (space.atomic_orbitals or []) if isinstance(space, ActiveSpace) else []
    for place, text in enumerate(texts):
        where = f"{path}.active_space.atomic_orbitals[{place}]"
        match = ORBITAL.match(text)
        if match is None:
            continue
        element, number = match[1], match[2]
        if number is None and element not in molecule.symbols:
            rule = f"names an element that molecule {molecule_name!r} does not hold"
            problems.append(Problem(where, text, rule))
        if number is not None:
            _, faults = find_atom(element + number, molecule.symbols, ())
            problems += [Problem(where, text, f"{f.rule}, in molecule {molecule_name!r}") for f in faults]
    return problems
