"""Names of elements, bases and functionals that the chemistry engine knows, and the size of every basis.

Read from ``known_names.json``, which ``scripts/make-known-names`` writes from the installed engine and
the Basis Set Exchange; so electrons and basis functions are counted without loading either.
"""

import difflib
import json
import re
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any, Final

_SYMBOLS = """
H He Li Be B C N O F Ne Na Mg Al Si P S Cl Ar K Ca Sc Ti V Cr Mn Fe Co Ni Cu Zn Ga Ge As Se Br Kr
Rb Sr Y Zr Nb Mo Tc Ru Rh Pd Ag Cd In Sn Sb Te I Xe Cs Ba La Ce Pr Nd Pm Sm Eu Gd Tb Dy Ho Er Tm Yb
Lu Hf Ta W Re Os Ir Pt Au Hg Tl Pb Bi Po At Rn Fr Ra Ac Th Pa U Np Pu Am Cm Bk Cf Es Fm Md No Lr Rf
Db Sg Bh Hs Mt Ds Rg Cn Nh Fl Mc Lv Ts Og
"""
ELEMENTS: Final[dict[str, int]] = {symbol: number for number, symbol in enumerate(_SYMBOLS.split(), 1)}
"""Atomic number by element symbol."""


@dataclass(frozen=True)
class AtomBasis:
    """A basis on one atom: spherical functions, and the ECP where there is one.

    ``ecp_core`` is the number of electrons the ECP stands for; ``ecp`` the name the engine
    finds it by, None for a basis of all electrons.
    """

    functions: int
    ecp_core: int = 0
    ecp: str | None = None


@cache
def known() -> dict[str, Any]:
    """Content of ``known_names.json``."""
    return json.loads((Path(__file__).parent / "known_names.json").read_text(encoding="utf-8"))


def normalised(basis: str) -> str:
    """A basis name as the engine compares it with its own tables: without case, ``-``, ``_`` and blanks."""
    return re.sub(r"[-_ ]", "", basis.lower())


def _exchange_key(basis: str) -> str:
    return basis.lower().replace("/", "_sl_").replace("*", "_st_")


def is_basis(basis: str) -> bool:
    """True for a name that the engine or the Basis Set Exchange knows."""
    return normalised(basis) in known()["pyscf"] or _exchange_key(basis) in known()["bse"]


def elements_of(basis: str) -> list[str]:
    """Elements a basis is there for, by atomic number."""
    return [symbol for symbol in ELEMENTS if basis_on(basis, symbol) is not None]


@cache
def basis_on(basis: str, symbol: str) -> AtomBasis | None:
    """A basis on an atom of an element: the engine's own table first, then the Basis Set Exchange.

    None where there is no such basis for the element.
    """
    own = known()["ecp_of"].get(normalised(basis), basis)
    for table, key in (("pyscf", normalised(basis)), ("bse", _exchange_key(basis))):
        for size, symbols in known()[table].get(key, {}).items():
            if symbol in symbols.split():
                functions, _, core = size.partition("+ecp")
                return AtomBasis(int(functions), int(core or 0), own if core else None)
    return None


def core_orbitals(symbol: str, ecp_core: int) -> int:
    """Orbitals of the usual frozen core of an atom that its ECP does not stand for already."""
    usual: int = known()["frozen_core"][ELEMENTS[symbol] - 1]
    return max(0, usual - ecp_core // 2)


def is_functional(name: str) -> bool:
    """True for a plain name, or ``exchange,correlation`` of known parts.  Expressions are refused.

    The engine reads a functional as an expression (sums, factors, parameters); only names
    from its own tables get there.
    """
    tables = {kind: set(text.split()) for kind, text in known()["functionals"].items()}
    parts = [part.strip() for part in name.upper().split(",")]
    if len(parts) == 2:
        return parts[0] in tables["exchange"] and parts[1] in tables["correlation"]
    return len(parts) == 1 and parts[0] in tables["complete"]


def functional_like(name: str) -> str:
    """``: did you mean B3LYP?`` for a near miss, "" otherwise."""
    return _like(name.upper(), known()["functionals"]["complete"].split())


def basis_like(name: str) -> str:
    """``: did you mean ...?`` for a near miss, "" otherwise."""
    exchange = [key.replace("_st_", "*").replace("_sl_", "/") for key in known()["bse"]]
    return _like(name.lower(), exchange)


def element_like(name: str) -> str:
    """``: did you mean Cl?`` where only the case is wrong, a hint to 118 symbols otherwise."""
    right = name.capitalize()
    return f": did you mean {right}?" if right in ELEMENTS else ""


def _like(name: str, choices: list[str]) -> str:
    near = difflib.get_close_matches(name, choices, n=3, cutoff=0.75)
    return f": did you mean {' or '.join(near)}?" if near else ""
