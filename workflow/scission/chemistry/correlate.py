"""Correlation methods on a finished reference, at one geometry."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from pyscf import gto
from pyscf.data.elements import chemcore

from scission.diagnostics import DIAGNOSTICS
from scission.records.store import Record, Store
from scission.solution import Solution

from . import scf
from .coupled_cluster import coupled_cluster
from .extras import EXTRAS
from .full_ci import full_ci
from .molecule import build_mole
from .nevpt2 import nevpt2
from .perturbation import second_order_energy
from .recording import Stopwatch, guarded, record_of
from .starts import carried

METHODS: dict[str, Callable[[dict[str, Any], Any, Record, int, Store], Solution]] = {
    "MP2": second_order_energy,
    "CCSD": coupled_cluster,
    "CCSD(T)": coupled_cluster,
    "FCI": full_ci,
    "NEVPT2": nevpt2,
}
"""Correlation -> function (task, mean field, reference record, frozen orbitals, store) -> Solution."""

_SCALARS_OF_REFERENCE = ("bond_", "vb_", "coulson_fischer")


def correlate_point(task: dict[str, Any], store: Store, watch: Stopwatch) -> Record:
    """Compute a point's correlation from the orbitals of its reference record.

    Raises:
        RuntimeError: the reference record is missing or not converged; callers check that before.
    """
    reference = store.read("reference", task["reference_key"])
    if reference is None or reference.status != "converged":
        raise RuntimeError(f"reference {task['reference_key']} is missing or not converged")
    mole = build_mole(task["molecule"], task["spec"]["basis"], np.array(task["positions"]))
    field = prepared_field(task, mole, reference)
    frozen = chemcore(mole) if task["frozen_core"] else 0
    if "calculation" in task:
        return _extra(task, field, reference, frozen, store, watch)
    solution = METHODS[task["correlation"]](task, field, reference, frozen, store)
    solution.correlation = task["correlation"]
    bounds = {"reference determinant": solution.energies["reference"]} if task["correlation"] == "FCI" else {}
    record = guarded(record_of(solution, "point", task, watch), solution, bounds, {})
    record.reference_stamp = reference.stamp
    _inherit(record, reference)
    return record


def _extra(
    task: dict[str, Any], field: Any, reference: Record, frozen: int, store: Store, watch: Stopwatch
) -> Record:
    """Return the record of a costly diagnostic's own calculation."""
    solution = EXTRAS[task["calculation"]](task, field, reference, frozen, store)
    record = record_of(solution, "point", task, watch, calculation=task["calculation"])
    record.reference_stamp = reference.stamp
    return record


def prepared_field(task: dict[str, Any], mole: gto.Mole, reference: Record) -> Any:
    """Return the mean field of the reference record, ready for a correlation method."""
    field = scf.build_field(mole, task["spec"])
    if task["spec"]["reference"] == "CASSCF":
        return field
    return scf.put_orbitals(field, carried(reference, mole), float(reference.scalars["energy"]))


def _inherit(record: Record, reference: Record) -> None:
    """Take over the diagnostics and remarks of the reference that the correlated record lacks."""
    for name, diagnostic in DIAGNOSTICS.items():
        if diagnostic.of_reference and name in reference.diagnostics and name not in record.diagnostics:
            record.diagnostics[name] = reference.diagnostics[name]
            record.absent.pop(name, None)
    record.notes = {**reference.notes, **record.notes}
    pictures = {n: v for n, v in reference.scalars.items() if n.startswith(_SCALARS_OF_REFERENCE)}
    record.scalars = {**pictures, **record.scalars}
    if "transfer_weights" in reference.arrays:
        record.arrays.setdefault("transfer_weights", reference.arrays["transfer_weights"])
    if "natural_occupations" in reference.arrays:
        record.arrays.setdefault("natural_occupations", reference.arrays["natural_occupations"])
