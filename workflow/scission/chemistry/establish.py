"""Tasks that make, compare and finish reference records."""

from __future__ import annotations

from typing import Any

import numpy as np

from scission.records.store import Record, Store
from scission.solution import Solution

from . import scf
from .bond_picture import describe_active_bond
from .bounds import lower_bounds, upper_bounds
from .casscf import finish_casscf, solve_casscf
from .compare import least_step, likeness
from .molecule import build_mole, overlap_roots
from .orbitals import Orbitals, not_orthonormal
from .pictures import PICTURE_FUNCTIONS, solve_picture
from .recording import Stopwatch, guarded, record_of
from .reference import solve_reference
from .solutions import solution_of_field
from .starts import carried, lowdin


def establish_reference(task: dict[str, Any], store: Store, watch: Stopwatch) -> Record:
    """Compute a reference from the task's starts; return the record that should now stand.

    ``task["replace"]`` says when the new result takes the place of a record that is already there:
    ``always``, ``lower`` (lower by more than convergence and grids explain, or converged where the old one was not),
    ``closer`` (same energy, more like the record ``task["closer_to"]``) or ``closer_state`` (more like it,
    at whatever energy).
    """
    new = _solve(task, store, watch)
    old = store.read("reference", task["key"])
    if old is None or task.get("replace", "always") == "always":
        return new
    return new if _takes_place(task, store, new, old) else old


def swap_spins(task: dict[str, Any], store: Store, _: Stopwatch) -> Record:
    """Return the record with alpha and beta exchanged: the same state, the other way round."""
    record = _required(store, task["key"])
    swapped = lowdin(record).spin_swapped()
    record.arrays |= {"mo_lowdin": swapped.coeff, "mo_occ": swapped.occ}
    record.arrays["orbital_energies"] = record.arrays["orbital_energies"][::-1].copy()
    return record


def finish_reference(task: dict[str, Any], store: Store, watch: Stopwatch) -> Record:
    """Return the record with its diagnostics: what is worth computing only for orbitals that stay."""
    record = _required(store, task["key"])
    if record.status != "converged":
        return record
    mole = build_mole(task["molecule"], task["spec"]["basis"], np.array(task["positions"]))
    if task["spec"]["reference"] == "CASSCF":
        solution = finish_casscf(task, record)
        describe_active_bond(solution, task)
    elif task["spec"]["reference"] in PICTURE_FUNCTIONS:
        solution = solve_picture(task)
    else:
        field = scf.put_orbitals(
            scf.build_field(mole, task["spec"]), carried(record, mole), record.scalars["energy"]
        )
        solution = solution_of_field(field, task["spec"], diagnose=True, bonds=task.get("bonds", ()))
        _keep_orbitals(solution)
    solution.notes = {**record.notes, **solution.notes, **task.get("notes", {})}
    bounds = upper_bounds(task["spec"], record, mole), lower_bounds(task["spec"], record, mole)
    finished = guarded(record_of(solution, "reference", task, watch), solution, *bounds)
    finished.scalars["wall_s"] += record.scalars.get("wall_s", 0.0)
    finished.scalars["cpu_s"] += record.scalars.get("cpu_s", 0.0)
    finished.attempts, finished.history = record.attempts, record.history
    finished.remedy = record.remedy
    return finished


def _solve(task: dict[str, Any], store: Store, watch: Stopwatch) -> Record:
    if task["spec"]["reference"] == "CASSCF":
        solution = solve_casscf(task, store)
    elif task["spec"]["reference"] in PICTURE_FUNCTIONS:
        solution = solve_picture(task)
    else:
        field, _, remark = solve_reference(task, store)
        solution = solution_of_field(field, task["spec"], diagnose=False)
        solution.notes["start"] = remark
        _keep_orbitals(solution)
    record = record_of(solution, "reference", task, watch, diagnose=False)
    error = max(not_orthonormal(x) for x in record.arrays["mo_lowdin"])
    if error > 1e-6:
        record.status, record.reason = "failed", "raised"
        record.message = f"orbitals are not orthonormal (largest deviation {error:.1e})"
    return record


def _keep_orbitals(solution: Solution) -> None:
    root, _ = overlap_roots(solution.overlap)
    kept = Orbitals(solution.mo_coeff, solution.mo_occ).transformed(root)
    solution.extra |= {"mo_lowdin": kept.coeff, "mo_occ": kept.occ}


def _takes_place(task: dict[str, Any], store: Store, new: Record, old: Record) -> bool:
    if new.status != "converged":
        return False
    if old.status != "converged":
        return True
    step = new.scalars["energy"] - old.scalars["energy"]
    if task["replace"] == "lower":
        return bool(step < -least_step(task["spec"]))
    neighbour = _required(store, task["closer_to"])
    alike = likeness(neighbour, new) > likeness(neighbour, old) + 1e-3
    return bool(alike and (task["replace"] == "closer_state" or step < least_step(task["spec"])))


def _required(store: Store, key: str) -> Record:
    record = store.read("reference", key)
    if record is None:
        raise RuntimeError(f"reference record {key} is missing: it must exist before it can be worked on")
    return record
