"""Which atoms move when a bond is stretched."""

import numpy as np
from numpy.typing import NDArray

from scission.geometry.labels import find_atom, label
from scission.geometry.path import Fault, GeometryError


def side_of(bonds: NDArray[np.bool_], fixed: int, moved: int) -> set[int]:
    """Atoms connected with ``moved`` once its bond to ``fixed`` is cut; bonds (n_atoms, n_atoms)."""
    cut = bonds.copy()
    cut[fixed, moved] = cut[moved, fixed] = False
    side, frontier = {moved}, [moved]
    while frontier:
        neighbours = {int(atom) for atom in np.flatnonzero(cut[frontier.pop()])} - side
        side |= neighbours
        frontier += neighbours
    return side


def moved_by_connectivity(
    bonds: NDArray[np.bool_], pair: tuple[int, int], symbols: tuple[str, ...]
) -> set[int]:
    """The second atom of the pair with everything bonded to it, directly or through others.

    Raises
    ------
    GeometryError
        The bond is part of a ring, so that no side can move by itself.
    """
    side = side_of(bonds, *pair)
    if pair[0] not in side:
        return side
    names = [label(symbols, atom) for atom in pair]
    rule = (
        f"is part of a ring: cutting it leaves one piece, so no side moves by itself. Say which atoms move "
        f"with the bond, for example move: [{names[1]}]"
    )
    raise GeometryError([Fault(("bond",), names, rule)])


def moved_by_choice(move: list[str], pair: tuple[int, int], symbols: tuple[str, ...]) -> set[int]:
    """Atoms of a ``move`` list.

    Raises
    ------
    GeometryError
        A label is wrong or given twice, or not exactly one atom of the bond is among them.
    """
    atoms, faults = [], []
    for place, text in enumerate(move):
        atom, found = find_atom(text, symbols, ("move", place))
        faults += found or ([Fault(("move", place), text, "is listed twice")] if atom in atoms else [])
        atoms.append(atom)
    if not faults and len(set(pair) & set(atoms)) != 1:
        names = " and ".join(label(symbols, atom) for atom in pair)
        faults.append(Fault(("move",), move, f"must hold exactly one of the bond's atoms {names}"))
    if faults:
        raise GeometryError(faults)
    return set(atoms)
