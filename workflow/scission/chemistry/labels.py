"""Labels that follow averaged states through avoided crossings."""

from __future__ import annotations

from typing import Any

import numpy as np
from pyscf import fci
from scipy.optimize import linear_sum_assignment

from scission.records.store import Record, Store

from .recording import Stopwatch


def label_states(task: dict[str, Any], store: Store, _: Stopwatch) -> Record:
    """Return the record with labels of its states taken over from the neighbour they overlap with most.

    Labels count from 1 in the order of energy at the start of the curve; without ``task["from"]`` they are set anew.
    """
    record = store.read("reference", task["key"])
    if record is None:
        raise RuntimeError(
            f"reference record {task['key']} is missing: it must exist before its states are labelled"
        )
    n = len(record.arrays["state_energies"])
    neighbour = store.read("reference", task["from"]) if task.get("from") else None
    if neighbour is None or "state_labels" not in neighbour.arrays:
        record.arrays["state_labels"] = np.arange(1, n + 1)
        return record
    old, new = linear_sum_assignment(-np.abs(state_overlaps(neighbour, record)))
    labels = np.empty(n, dtype=np.int64)
    labels[new] = neighbour.arrays["state_labels"][old]
    record.arrays["state_labels"] = labels
    return record


def state_overlaps(a: Record, b: Record) -> np.ndarray:
    """Return the overlaps (n_states, n_states) of two records' states.

    The active orbitals of ``a`` are turned to those of ``b`` by the orthogonal matrix nearest to their overlap.
    """
    n_core, n_active, n_electrons = (int(n) for n in a.arrays["active"])
    window = slice(n_core, n_core + n_active)
    overlap = a.arrays["mo_lowdin"][0][:, window].T @ b.arrays["mo_lowdin"][0][:, window]
    u, _, vt = np.linalg.svd(overlap)
    unpaired = a.inputs["molecule"]["multiplicity"] - 1
    n_beta = (n_electrons - unpaired) // 2
    electrons = (n_electrons - n_beta, n_beta)
    turned = [fci.addons.transform_ci(v, electrons, u @ vt).ravel() for v in a.arrays["ci"]]
    return np.array([[t @ w.ravel() for w in b.arrays["ci"]] for t in turned])
