"""Atom labels: element and number counted from 1 over all atoms, such as ``O1``."""

import re

from scission.geometry.path import Fault

_LABEL = re.compile(r"([A-Z][a-z]?)([1-9][0-9]{0,5})\Z")


def label(symbols: tuple[str, ...], atom: int) -> str:
    """Label of a 0-based atom."""
    return f"{symbols[atom]}{atom + 1}"


def find_atom(text: str, symbols: tuple[str, ...], where: tuple[str | int, ...]) -> tuple[int, list[Fault]]:
    """0-based atom of a label; -1 and a fault where there is none or it is of another element."""
    match = _LABEL.match(text)
    labels = ", ".join(label(symbols, atom) for atom in range(min(len(symbols), 12)))
    labels += ", ..." if len(symbols) > 12 else ""
    if match is None:
        return -1, [
            Fault(where, text, f"is not an atom label: element and number, counted from 1 ({labels})")
        ]
    element, number = match[1], int(match[2])
    if number > len(symbols):
        return -1, [
            Fault(where, text, f"is not an atom of the molecule, which has {len(symbols)} ({labels})")
        ]
    if symbols[number - 1] != element:
        found = label(symbols, number - 1)
        return -1, [Fault(where, text, f"names the wrong element: atom {number} is {found} ({labels})")]
    return number - 1, []
