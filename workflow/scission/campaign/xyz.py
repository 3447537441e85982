"""Atoms from text: the ``atoms`` block of a campaign and xyz files.

Numbers are read with ``float`` and elements looked up in a list; nothing is evaluated.
"""

import math
import re
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from scission import units
from scission.campaign.names import ELEMENTS, element_like
from scission.campaign.problems import MISSING, Problem

MOST_ATOMS = 500
LARGEST_FILE = 1024 * 1024
FARTHEST_BOHR = 1e4

_NUMBER = re.compile(r"[-+]?([0-9]+\.?[0-9]*|\.[0-9]+)([eE][-+]?[0-9]+)?\Z")

Atoms = tuple[tuple[str, ...], NDArray[np.float64], list[Problem]]


def parse_atoms(text: str, unit: str, path: str = "atoms") -> Atoms:
    """Symbols, positions of shape (n_atoms, 3) in bohr, and the problems of a block ``element x y z``."""
    lines = [(number, line) for number, line in enumerate(text.splitlines(), 1) if line.strip()]
    problems: list[Problem] = []
    if not lines:
        problems.append(Problem(path, text, "holds no atoms: write one a line, element x y z"))
    if len(lines) > MOST_ATOMS:
        problems.append(Problem(path, len(lines), f"atoms are too many: at most {MOST_ATOMS}"))
        return (), np.empty((0, 3)), problems
    symbols, rows = [], []
    for number, line in lines:
        symbol, row, found = _atom(line, f"{path} line {number}")
        symbols.append(symbol)
        rows.append(row)
        problems += found
    factor = units.ANGSTROM_IN_BOHR if unit == "angstrom" else 1.0
    positions = np.array(rows, dtype=np.float64).reshape(-1, 3) * factor
    return tuple(symbols), positions, problems or _far(positions, path)


def _atom(line: str, path: str) -> tuple[str, list[float], list[Problem]]:
    """One line; what cannot be read is NaN, and a problem."""
    symbol, *numbers = line.split()
    problems = []
    if symbol not in ELEMENTS:
        problems.append(Problem(path, symbol, f"is not an element{element_like(symbol)}"))
    if len(numbers) != 3:
        problems.append(Problem(path, line.strip(), "must be an element and three numbers: element x y z"))
        return symbol, [0.0, 0.0, 0.0], problems
    row = [float(number) if _NUMBER.match(number) else math.nan for number in numbers]
    for number, value in zip(numbers, row, strict=True):
        if not math.isfinite(value):
            problems.append(Problem(path, number, "is not a finite number"))
    return symbol, row, problems


def _far(positions: NDArray[np.float64], path: str) -> list[Problem]:
    rule = f"bohr is farther from the origin than {FARTHEST_BOHR:g} bohr: check the numbers and the unit"
    far = [float(x) for x in positions.ravel() if abs(x) > FARTHEST_BOHR]
    return [Problem(path, far[0], rule)] if far else []


def read_xyz(name: str, directory: Path, path: str) -> Atoms:
    """Atoms of an xyz file: the number of atoms, a comment line, then ``element x y z`` in angstrom."""
    nothing = (), np.empty((0, 3))
    text, problem = _read_text(name, directory, path)
    if problem is not None:
        return *nothing, [problem]
    first, _, rest = text.partition("\n")
    if not re.fullmatch(r"[0-9]{1,6}", first.strip()):
        return *nothing, [Problem(path, first.strip(), f"must be the number of atoms: first line of {name}")]
    body = rest.partition("\n")[2].rstrip()
    count, lines = int(first), len(body.splitlines())
    if count != lines:
        rule = f"is the number of atoms in the first line of {name}, but {lines} lines of atoms follow"
        return *nothing, [Problem(path, count, rule)]
    return parse_atoms(body, "angstrom", path)


def _read_text(name: str, directory: Path, path: str) -> tuple[str, Problem | None]:
    try:
        file = directory / name
        if not file.is_file():
            return "", Problem(path, name, f"is not a file (looked for it in {directory})")
        if file.stat().st_size > LARGEST_FILE:
            return "", Problem(path, name, f"is larger than {LARGEST_FILE} bytes: one geometry is expected")
        return file.read_bytes().decode("utf-8-sig"), None
    except UnicodeDecodeError:
        return "", Problem(path, name, "is not a text file in UTF-8")
    except (OSError, ValueError) as error:
        return "", Problem(path, name, f"cannot be read: {error}")


def xyz_missing(atoms: str | None, xyz: str | None, path: str) -> list[Problem]:
    """Exactly one of ``atoms`` and ``xyz`` must be there."""
    if atoms is None and xyz is None:
        return [Problem(path, MISSING, "needs its atoms: give atoms or xyz")]
    if atoms is not None and xyz is not None:
        return [Problem(f"{path}.xyz", xyz, "stands beside atoms: give one of the two")]
    return []
