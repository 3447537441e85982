"""Self-consistent references at one geometry: try starts, keep the right one.

The walk over a scan (:mod:`scission.chemistry.walk`) says from where to start and what counts as right.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np
from pyscf import gto

from scission.records.store import Record, Store

from . import scf
from .molecule import build_mole, root_overlap
from .orbitals import Orbitals, state_overlap_any_spin
from .starts import UNRESTRICTED, Start, carried, distinct, finished_parent, spin_density, starting_densities

_SAME_ENERGY = 1e-7
_ROUGH_ROOM = 0.005
"""By how much (hartree) converging a rough start to its end may still lower it."""
_ALIKE = 0.9
"""Below this overlap with the orbitals it was started from a determinant is another state."""
_FLAT = 0.01
"""Below this curvature (hartree) an orbital's rotation costs so little that it may not have converged."""


def solve_reference(task: dict[str, Any], store: Store) -> tuple[Any, gto.Mole, str]:
    """Return (field, molecule, remark) of the start that fits the task best.

    ``task["starts"]`` lists the starts, each a mapping with one of the keys ``carry`` (key of a finished
    record whose orbitals are carried here), ``standing`` (the record that is there already, as it is),
    ``engine`` (one of the engine's own guesses), ``broken`` (along the triplet instability of the restricted
    determinant), ``fragments`` (all splits of the fragments).
    ``task["choose"]`` is ``first`` (the first start that converges, else the lowest) or ``lowest``;
    ``task["stability"]`` asks to follow internal instabilities of the one that was chosen, and
    ``task["polish"]`` to turn it along its flattest directions as well.

    Raises:
        RuntimeError: none of the starts is there.
    """
    mole = build_mole(task["molecule"], task["spec"]["basis"], np.array(task["positions"]))
    best: Any = None
    remark = ""
    first = task.get("choose") == "first"
    for label, field in candidates(task, store, mole) if first else _lowest(task, store, mole):
        if best is None or _better(field, best):
            best, remark = field, label
        if first and field.converged:
            break
    if best is None:
        raise RuntimeError("no start was given from which the reference could be computed")
    if task.get("stability") and best.converged:
        best, flattest = _stable(best)
        if task.get("polish") and flattest < _FLAT:
            best = scf.polish(best)
    return best, mole, remark


def candidates(task: dict[str, Any], store: Store, mole: gto.Mole) -> Iterator[tuple[str, Any]]:
    """Yield (how it was started, converged or unconverged field) of each start, one after another."""
    for start in task["starts"]:
        parent = finished_parent(start, store)
        if parent is not None:
            yield f"carried from {parent.key}", _from_parent(task, mole, parent)
            continue
        for label, density in starting_densities(task, [start], store, mole):
            yield label, _converged(task, mole, density)


def _lowest(task: dict[str, Any], store: Store, mole: gto.Mole) -> Iterator[tuple[str, Any]]:
    """Yield fields of the starts that may be the lowest, none that rough convergence leaves without a chance."""
    if task["starts"] == [{"standing": True}]:
        own = store.read("reference", task["key"])
        if own is not None and own.status == "converged":
            yield own.notes.get("start", ""), _standing(task, mole, own)
        return
    starts = list(starting_densities(task, task["starts"], store, mole))
    ranked: list[tuple[float, Start]] = [(-np.inf, start) for start in starts]
    if len(starts) > 1:
        ranked = distinct(task["spec"], mole, starts)
    best = np.inf
    for energy, (label, density) in ranked:
        if energy < best + _ROUGH_ROOM:
            field = _converged(task, mole, density)
            best = min(best, float(field.e_tot)) if field.converged else best
            yield label, field


def _converged(task: dict[str, Any], mole: gto.Mole, density: Any) -> Any:
    return scf.converge(scf.build_field(mole, task["spec"]), density, task.get("remedy", ""))


def _standing(task: dict[str, Any], mole: gto.Mole, own: Record) -> Any:
    field = scf.build_field(mole, task["spec"])
    return scf.put_orbitals(field, carried(own, mole), float(own.scalars["energy"]))


def _from_parent(task: dict[str, Any], mole: gto.Mole, parent: Record) -> Any:
    """Converge from a parent's orbitals; where the result is another state, stay near with second order."""
    spec = task["spec"]
    start = carried(parent, mole)
    field = _converged(task, mole, spin_density(spec, start))
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


def _as_engine(spec: dict[str, Any], orbitals: Orbitals) -> tuple[Any, Any]:
    if spec["reference"] in UNRESTRICTED:
        return orbitals.by_spin()
    return orbitals.coeff[0], orbitals.occ[0]


def _better(new: Any, old: Any) -> bool:
    if new.converged != old.converged:
        return bool(new.converged)
    return bool(new.e_tot < old.e_tot - _SAME_ENERGY)
