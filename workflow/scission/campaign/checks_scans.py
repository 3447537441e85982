"""Each scan: its lengths, its bond, and whether atoms run into each other on the way."""

from itertools import pairwise

import numpy as np

from scission import units
from scission.campaign.checks_molecules import CLOSEST_ANGSTROM
from scission.campaign.model import Grid, Molecule, Scan, Stretch
from scission.campaign.parts import Parts
from scission.campaign.problems import MISSING, Problem, dotted
from scission.geometry import COORDINATES, GeometryError, ScanPath, build_path
from scission.geometry.labels import label

MOST_LENGTHS = 100_000
MOST_POINTS = 1_000_000
MOST_COORDINATES = 5_000_000
"""Points times atoms of one scan: beyond it the geometries alone take hundreds of megabytes."""


def check_scans(parts: Parts) -> list[Problem]:
    """Every scan of the campaign, and how many points they are together."""
    problems, total = [], 0
    for name, scan in parts.scans.items():
        path = f"scans.{name}"
        found = _coordinate(scan, path) + _lengths(scan.stretch, f"{path}.stretch.lengths")
        molecule = parts.molecules.get(scan.molecule)
        if molecule is not None and scan.stretch is not None and not found:
            found = _geometry(molecule, scan, path, scan.molecule in parts.crowded_molecules)
        total += number_of_lengths(scan.stretch) * len(scan.levels)
        problems += found
    if total > MOST_POINTS:
        rule = f"points are more than a campaign may have ({MOST_POINTS}): take fewer lengths or levels"
        problems.append(Problem("scans", total, rule))
    return problems


def number_of_lengths(stretch: Stretch | None) -> int:
    """Geometries of a scan."""
    if stretch is None:
        return 0
    return len(stretch.lengths) if isinstance(stretch.lengths, list) else stretch.lengths.points


def _coordinate(scan: Scan, path: str) -> list[Problem]:
    given = [kind for kind in COORDINATES if getattr(scan, kind) is not None]
    if len(given) == 1:
        return []
    return [Problem(path, given or MISSING, f"needs exactly one coordinate ({', '.join(COORDINATES)})")]


def _lengths(stretch: Stretch | None, path: str) -> list[Problem]:
    if stretch is None:
        return []
    if number_of_lengths(stretch) > MOST_LENGTHS:
        points = f"{path}.points" if isinstance(stretch.lengths, Grid) else path
        rule = f"points are more than a scan may have ({MOST_LENGTHS})"
        return [Problem(points, number_of_lengths(stretch), rule)]
    return _grid(stretch.lengths, path) if isinstance(stretch.lengths, Grid) else _list(stretch.lengths, path)


def _grid(grid: Grid, path: str) -> list[Problem]:
    if grid.from_ > grid.to:
        return [Problem(f"{path}.to", grid.to, f"must be above from ({grid.from_:g})")]
    if grid.from_ == grid.to and grid.points > 1:
        rule = f"points from {grid.from_:g} to {grid.to:g} are the same point: widen the range or ask for 1"
        return [Problem(f"{path}.points", grid.points, rule)]
    if grid.from_ < grid.to and grid.points < 2:
        return [
            Problem(f"{path}.points", grid.points, "must be at least 2 for a range: both ends are points")
        ]
    return []


def _list(lengths: list[float], path: str) -> list[Problem]:
    problems = [
        Problem(f"{path}[{place}]", length, "must be above 0")
        for place, length in enumerate(lengths)
        if length <= 0
    ]
    for place, (before, length) in enumerate(pairwise(lengths), 1):
        if length <= before:
            rule = f"must be above the length before it ({before:g}): lengths increase"
            problems.append(Problem(f"{path}[{place}]", length, rule))
    return problems


def _geometry(molecule: Molecule, scan: Scan, path: str, crowded: bool) -> list[Problem]:
    """Builds the geometries, as the run will, and looks for atoms on top of each other."""
    points, atoms = number_of_lengths(scan.stretch), len(molecule.symbols)
    if points * atoms > MOST_COORDINATES:
        rule = f"points of {atoms} atoms are more than one scan can hold ({MOST_COORDINATES} together)"
        return [Problem(f"{path}.stretch.lengths", points, rule)]
    try:
        scan_path = build_path(molecule, scan)
        return [] if crowded else _collisions(molecule, scan_path, f"{path}.stretch.lengths")
    except GeometryError as error:
        # Atoms on top of each other make rings and bonds without length: follow-ons, not problems.
        faults = [fault for fault in error.faults if not crowded or fault.where != ("stretch", "bond")]
        return [Problem(f"{path}.{dotted(fault.where)}", fault.value, fault.rule) for fault in faults]


def _collisions(molecule: Molecule, scan_path: ScanPath, path: str) -> list[Problem]:
    """The first length, if any, at which a moving atom comes too near one that stays."""
    staying = list(scan_path.fragments[0])
    least = CLOSEST_ANGSTROM * units.ANGSTROM_IN_BOHR
    for atom in scan_path.fragments[1]:
        apart = scan_path.positions[:, staying] - scan_path.positions[:, [atom]]
        distances = np.sqrt(np.einsum("psx,psx->ps", apart, apart))
        if distances.min() < least:
            point, other = np.argwhere(distances < least)[0]
            names = f"{label(molecule.symbols, staying[other])} and {label(molecule.symbols, atom)}"
            distance = distances[point, other] * units.BOHR_IN_ANGSTROM
            rule = (
                f"angstrom puts {names} {distance:.3g} angstrom apart: at least {CLOSEST_ANGSTROM} is needed"
            )
            return [Problem(path, float(scan_path.values[point, 0]), rule)]
    return []
