"""Where self-consistent fields start from: densities of neighbours, of guesses, of broken symmetry, of fragments."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from typing import Any

import numpy as np
from pyscf import gto

from scission.records.store import Record, Store

from . import scf
from .fragments import fragment_densities
from .molecule import root_overlap
from .orbitals import Orbitals

_DISTINCT = 1e-4
"""Rough energies (hartree) closer than this belong to one solution, or to equivalent ones."""
_HOPELESS = 0.1
"""Starts this far (hartree) above the lowest one are not worth converging."""
UNRESTRICTED = ("UHF", "UKS")

Start = tuple[str, Any]
"""Where a field starts from: in words, and its density."""


def carried(record: Record, mole: gto.Mole) -> Orbitals:
    """Return a record's orbitals carried to ``mole``: orthonormal there, as like the old ones as can be."""
    _, inverse_root = root_overlap(mole)
    return lowdin(record).transformed(inverse_root)


def lowdin(record: Record) -> Orbitals:
    """Return a record's orbitals in symmetrically orthogonalised basis functions."""
    return Orbitals(record.arrays["mo_lowdin"], record.arrays["mo_occ"])


def finished_parent(start: dict[str, Any], store: Store) -> Record | None:
    """Return the converged record whose orbitals a start carries, or ``None``."""
    parent = store.read("reference", start["carry"]) if "carry" in start else None
    return parent if parent is not None and parent.status == "converged" else None


def starting_densities(
    task: dict[str, Any], starts: Iterable[dict[str, Any]], store: Store, mole: gto.Mole
) -> Iterator[Start]:
    """Yield what each of ``starts`` (see :func:`.reference.solve_reference`) gives, one after another."""
    spec = task["spec"]
    for start in starts:
        parent = finished_parent(start, store)
        if parent is not None:
            yield f"carried from {parent.key}", spin_density(spec, carried(parent, mole))
        elif "engine" in start:
            density = scf.default_density(scf.build_field(mole, spec), start["engine"])
            yield f"engine's {start['engine']} guess", density
        elif "broken" in start:
            yield from _broken(spec, mole)
        elif "fragments" in start and len(task["fragments"]) == 2:
            yield from _from_fragments(task, mole)


def distinct(spec: dict[str, Any], mole: gto.Mole, starts: Iterable[Start]) -> list[tuple[float, Start]]:
    """Return starts of distinct solutions with their rough energies, hartree, lowest first.

    Rough convergence tells them apart at a fraction of the cost; what lies far above the lowest is left out.
    """
    rough: list[tuple[float, Start]] = []
    for label, density in starts:
        field = scf.roughly(scf.build_field(mole, spec), density)
        rough.append((float(field.e_tot), (label, np.asarray(field.make_rdm1()))))
    kept: list[tuple[float, Start]] = []
    for energy, start in sorted(rough, key=lambda r: r[0]):
        alike = any(abs(energy - known) < _DISTINCT for known, _ in kept)
        if not alike and energy < (kept[0][0] if kept else energy) + _HOPELESS:
            kept.append((energy, start))
    return kept


def spin_density(spec: dict[str, Any], orbitals: Orbitals) -> Any:
    """Return the density of orbitals in the shape a reference starts from."""
    density = orbitals.density()
    if spec["reference"] in UNRESTRICTED and density.ndim == 2:
        return np.array([density / 2, density / 2])
    return density


def _broken(spec: dict[str, Any], mole: gto.Mole) -> Iterator[Start]:
    """Yield the unrestricted density that lies along the restricted determinant's triplet instability."""
    if mole.spin != 0 or mole.nelectron < 2:
        return
    closed = {**spec, "reference": "RKS" if spec.get("functional") else "RHF"}
    restricted = scf.converge(scf.build_field(mole, closed), None)
    start = scf.broken_symmetry_start(restricted)
    if start is not None:
        yield "along the triplet instability", start.density()


def _from_fragments(task: dict[str, Any], mole: gto.Mole) -> Iterator[Start]:
    """Yield densities of the fragments; for Kohn-Sham those that Hartree-Fock makes of them, where they differ."""
    positions = np.array(task["positions"])
    a, b = task["bonds"][0]
    basis, axis = task["spec"]["basis"], positions[b] - positions[a]
    found = fragment_densities(task["molecule"], basis, positions, task["fragments"], axis)
    if not task["spec"].get("functional"):
        yield from found
        return
    plain = {**task["spec"], "reference": "UHF", "functional": None}
    yield from (start for _, start in distinct(plain, mole, found))
