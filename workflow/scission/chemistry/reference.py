"""Self-consistent references at one geometry: try starts, keep the right one, write the record.

The walk over a scan (:mod:`scission.chemistry.walk`) says from where to start and what counts as right.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np
from pyscf import gto

from scission.records.store import Record, Store

from . import scf
from .fragments import fragment_densities
from .molecule import build_mole, root_overlap
from .orbitals import Orbitals, state_overlap_any_spin

_SAME_ENERGY = 1e-7
_DISTINCT = 1e-4
_HOPELESS = 0.1
"""Solutions this far (hartree) above the lowest one from fragments are not worth converging."""
_ALIKE = 0.9
"""Below this overlap with the orbitals it was started from a determinant is another state."""
_FLAT = 0.01
"""Below this curvature (hartree) an orbital's rotation costs so little that it may not have converged."""
UNRESTRICTED = ("UHF", "UKS")


def solve_reference(task: dict[str, Any], store: Store) -> tuple[Any, gto.Mole, str]:
    """Return (field, molecule, remark) of the start that fits the task best.

    ``task["starts"]`` lists the starts, each a mapping with one of the keys ``carry`` (key of a finished
    record whose orbitals are carried here), ``standing`` (the record that is there already, as it is),
    ``engine`` (one of the engine's own guesses), ``broken`` (along the triplet instability of the restricted
    determinant), ``fragments`` (all splits of the fragments).
    ``task["choose"]`` is ``first`` (the first start that converges, else the lowest) or ``lowest``;
    ``task["stability"]`` asks to follow internal instabilities of the one that was chosen, and
    ``task["polish"]`` to turn it along its flattest directions as well.
    """
    mole = build_mole(task["molecule"], task["spec"]["basis"], np.array(task["positions"]))
    best: Any = None
    remark = ""
    for label, field in candidates(task, store, mole):
        if best is None or _better(field, best):
            best, remark = field, label
        if task.get("choose") == "first" and field.converged:
            break
    if best is None:
        raise RuntimeError("no start was given from which the reference could be computed")
    if task.get("stability") and best.converged:
        best, flattest = _stable(best)
        if task.get("polish") and flattest < _FLAT:
            best = scf.polish(best)
    return best, mole, remark


def carried(record: Record, mole: gto.Mole) -> Orbitals:
    """Return a record's orbitals carried to ``mole``: orthonormal there, as like the old ones as can be."""
    _, inverse_root = root_overlap(mole)
    return Orbitals(record.arrays["mo_lowdin"], record.arrays["mo_occ"]).transformed(inverse_root)


def lowdin(record: Record) -> Orbitals:
    """Return a record's orbitals in symmetrically orthogonalised basis functions."""
    return Orbitals(record.arrays["mo_lowdin"], record.arrays["mo_occ"])


def candidates(task: dict[str, Any], store: Store, mole: gto.Mole) -> Iterator[tuple[str, Any]]:
    """Yield (how it was started, converged or unconverged field) of each start, one after another."""
    spec, remedy = task["spec"], task.get("remedy", "")
    for start in task["starts"]:
        if "carry" in start:
            parent = store.read("reference", start["carry"])
            if parent is not None and parent.status == "converged":
                yield f"carried from {parent.key}", _from_parent(task, mole, parent, remedy)
        elif start.get("standing"):
            own = store.read("reference", task["key"])
            if own is not None and own.status == "converged":
                field = scf.build_field(mole, spec)
                yield (
                    own.notes.get("start", ""),
                    scf.put_orbitals(field, carried(own, mole), float(own.scalars["energy"])),
                )
        elif "engine" in start:
            field = scf.build_field(mole, spec)
            density = scf.default_density(field, start["engine"])
            yield f"engine's {start['engine']} guess", scf.converge(field, density, remedy)
        elif "broken" in start:
            yield from _broken(spec, mole)
        elif "fragments" in start and len(task["fragments"]) == 2:
            yield from _from_fragments(task, mole, remedy)


def _from_parent(task: dict[str, Any], mole: gto.Mole, parent: Record, remedy: str) -> Any:
    """Converge from a parent's orbitals; where the result is another state, stay near with second order."""
    spec = task["spec"]
    start = carried(parent, mole)
    field = scf.converge(scf.build_field(mole, spec), _spin_density(spec, start), remedy)
    if task.get("choose") != "first" or _likeness(field, start, mole) >= _ALIKE:
        return field
    near = scf.second_order(scf.build_field(mole, spec), *_as_engine(spec, start))
    if near.converged and (
        not field.converged or _likeness(near, start, mole) > _likeness(field, start, mole)
    ):
        return near
    return field


def _likeness(field: Any, start: Orbitals, mole: gto.Mole) -> float:
    root, _ = root_overlap(mole)
    return state_overlap_any_spin(start.transformed(root), scf.orbitals_of(field).transformed(root))[0]


def _broken(spec: dict[str, Any], mole: gto.Mole) -> Iterator[tuple[str, Any]]:
    """Yield the unrestricted solution that lies along the restricted determinant's triplet instability."""
    if mole.spin != 0 or mole.nelectron < 2:
        return
    closed = {**spec, "reference": "RKS" if spec.get("functional") else "RHF"}
    restricted = scf.converge(scf.build_field(mole, closed), None)
    start = scf.broken_symmetry_start(restricted)
    if start is not None:
        yield "along the triplet instability", scf.converge(scf.build_field(mole, spec), start.density())


def _from_fragments(task: dict[str, Any], mole: gto.Mole, remedy: str) -> Iterator[tuple[str, Any]]:
    for label, density in _screened(task, mole):
        field = scf.build_field(mole, task["spec"])
        yield label, scf.converge(field, density, remedy)


def _screened(task: dict[str, Any], mole: gto.Mole) -> Iterator[tuple[str, Any]]:
    """Yield densities that start from the fragments, of distinct solutions only, lowest first.

    Roughly converged Hartree-Fock tells them apart at a fraction of the cost, for Kohn-Sham at a tenth.
    """
    positions = np.array(task["positions"])
    a, b = task["bonds"][0]
    basis, axis = task["spec"]["basis"], positions[b] - positions[a]
    plain = {**task["spec"], "reference": "UHF", "functional": None}
    rough: list[tuple[float, str, Any]] = []
    for label, density in fragment_densities(task["molecule"], basis, positions, task["fragments"], axis):
        field = scf.roughly(scf.build_field(mole, plain), density)
        rough.append((field.e_tot, label, np.asarray(field.make_rdm1())))
    known: list[float] = []
    for energy, label, density in sorted(rough, key=lambda r: r[0]):
        if (
            not any(abs(energy - e) < _DISTINCT for e in known)
            and energy < (known or [energy])[0] + _HOPELESS
        ):
            known.append(energy)
            yield label, density


def _stable(field: Any) -> tuple[Any, float]:
    """Follow internal instabilities; of equal alpha and beta orbitals those that make them differ.

    Returns the field and the lowest eigenvalue of its orbital Hessian, hartree.
    """
    if not _equal_spins(field):
        return scf.follow_instability(field)
    start = scf.broken_symmetry_start(scf.closed_shell_twin(field))
    if start is None:
        return field, np.inf
    lower = scf.second_order(field.copy(), start.coeff, start.occ)
    if lower.converged and lower.e_tot < field.e_tot - _SAME_ENERGY:
        return scf.follow_instability(lower)
    return field, np.inf


def _equal_spins(field: Any) -> bool:
    """Whether an unrestricted singlet has the same orbitals for both spins: its own analysis is blind there."""
    return isinstance(field, scf.uhf.UHF) and field.mol.spin == 0 and abs(field.spin_square()[0]) < 1e-5


def _spin_density(spec: dict[str, Any], orbitals: Orbitals) -> Any:
    density = orbitals.density()
    if spec["reference"] in UNRESTRICTED and density.ndim == 2:
        return np.array([density / 2, density / 2])
    return density


def _as_engine(spec: dict[str, Any], orbitals: Orbitals) -> tuple[Any, Any]:
    if spec["reference"] in UNRESTRICTED:
        return orbitals.by_spin()
    return orbitals.coeff[0], orbitals.occ[0]


def _better(new: Any, old: Any) -> bool:
    if new.converged != old.converged:
        return bool(new.converged)
    return bool(new.e_tot < old.e_tot - _SAME_ENERGY)
