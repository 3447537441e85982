"""One fragment of a broken bond, by itself, at the level of the molecule."""

from __future__ import annotations

from dataclasses import dataclass, replace
from math import comb
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pyscf import gto
from pyscf.data.elements import chemcore

from scission.records.store import Record, Store
from scission.solution import Solution

from .bond_picture import localise, partition
from .casscf import casci_object, finish_casscf, second_order_casscf
from .correlate import METHODS
from .molecule import build_mole, root_overlap
from .recording import Stopwatch, inputs_of, provenance, record_of
from .reference import solve_reference
from .solutions import solution_of_field
from .starts import UNRESTRICTED

Array = NDArray[np.float64]

_STARTS: list[dict[str, Any]] = [{"engine": "minao"}, {"engine": "atom"}]
_LADDER = ("", "level-shift", "damping", "second-order")
_ROOM = 1e-6
"""By how much (hartree) an active space may lie above the determinant within it before it counts as wrong."""


@dataclass
class Share:
    """A fragment's part of the molecule's active space.

    ``coeff`` (n_ao, n_ao) are orbitals of the fragment to start from: inactive, active, empty.
    """

    n_inactive: int
    n_active: int
    coeff: Array
    words: str


def compute_fragment(task: dict[str, Any], store: Store, watch: Stopwatch) -> Record:
    """Return the record of a fragment.

    A state that the level does not have is ``skipped``, and so is one of an active space as long as no
    reference of the scan is there to take the fragment's share from.
    """
    mole = build_mole(task["molecule"], task["spec"]["basis"], np.array(task["positions"]))
    if mole.nelectron == 0:
        return _bare(task, mole, watch)
    if max(mole.nelec) > mole.nao:
        return _skipped(
            task, watch, "not-defined", f"{mole.nelectron} electrons do not fit {mole.nao} basis functions"
        )
    if task["spec"]["reference"] != "CASSCF":
        return _record(_determinant_level(task, mole, store, watch), task, watch)
    reference = _first_good(task["share_from"], store)
    if reference is None:
        words = "no reference of the scan converged, so its share of the active space is unknown"
        return _skipped(task, watch, "reference-missing", words)
    share = active_share(task, reference, mole)
    n_electrons = mole.nelectron - 2 * share.n_inactive
    room = mole.spin <= n_electrons and (n_electrons + mole.spin) // 2 <= share.n_active
    if not room:
        words = f"{n_electrons} active electrons, {mole.spin} unpaired, do not fit: {share.words}"
        return _skipped(task, watch, "not-defined", words)
    solution = _active_level(task, mole, share, n_electrons, store, watch)
    solution.notes["active_space"] = share.words
    return _record(solution, task, watch)


def active_share(task: dict[str, Any], record: Record, mole: gto.Mole) -> Share:
    """Return the share of the fragment ``task["which"]`` in the active space of a reference of the scan.

    The molecule's inactive and active orbitals are localised by population and cut down to the fragment.
    """
    which, fragments = task["which"], task["fragments"]
    whole = build_mole(record.inputs["molecule"], record.inputs["spec"]["basis"], record.arrays["positions"])
    parts = partition(whole, fragments if which == 0 else fragments[::-1])
    n_inactive, n_active, _ = (int(n) for n in record.arrays["active"])
    x = record.arrays["mo_lowdin"][0]
    inactive, active = x[:, :n_inactive], x[:, n_inactive : n_inactive + n_active]
    own = round(float(np.sum(inactive[parts.first] ** 2)))
    turned, n_own = localise(active, parts)
    _, vectors = np.linalg.eigh(inactive[parts.first].T @ inactive[parts.first])
    closest = inactive @ vectors[:, ::-1][:, :own]
    cut = (parts.inverse_root @ np.hstack([closest, turned[:, :n_own]]))[parts.first]
    root, inverse_root = root_overlap(mole)
    q, _ = np.linalg.qr(root @ cut, mode="complete")
    words = f"{n_own} of {n_active} active orbitals lie on this fragment, beside {own} doubly occupied ones"
    return Share(own, n_own, inverse_root @ q, words)


def _first_good(keys: list[str], store: Store) -> Record | None:
    for key in keys:
        record = store.read("reference", key)
        if record is not None and record.status == "converged":
            return record
    return None


def _determinant(task: dict[str, Any], spec: dict[str, Any], store: Store) -> Any:
    """Return the lowest converged field of a determinant reference, from several starts and remedies."""
    field = None
    starts = _STARTS + ([{"broken": True}] if spec["reference"] in UNRESTRICTED else [])
    for remedy in _LADDER:
        helper = {
            **task,
            "spec": spec,
            "starts": starts,
            "choose": "lowest",
            "stability": True,
            "remedy": remedy,
        }
        field, _, _ = solve_reference({**helper, "fragments": []}, store)
        if field.converged:
            break
    return field


def _determinant_level(task: dict[str, Any], mole: gto.Mole, store: Store, watch: Stopwatch) -> Solution:
    field = _determinant(task, task["spec"], store)
    return _on_determinant(task, mole, field, store, watch)


def _on_determinant(
    task: dict[str, Any], mole: gto.Mole, field: Any, store: Store, watch: Stopwatch
) -> Solution:
    """Return a correlation method on a determinant, or the determinant where nothing is left to correlate."""
    solution = solution_of_field(field, task["spec"], diagnose=False)
    frozen = chemcore(mole) if task["frozen_core"] else 0
    method = task["correlation"]
    if method == "none" or not field.converged or not _correlates(mole, frozen):
        return solution
    reference = record_of(solution, "fragment", task, watch, diagnose=False)
    correlated = METHODS[method]({**task, "fragments": []}, field, reference, frozen, store)
    correlated.correlation = method
    return correlated


def _correlates(mole: gto.Mole, frozen: int) -> bool:
    """Whether there are two electrons to correlate and an orbital to correlate them in."""
    return mole.nelectron - 2 * frozen > 1 and min(mole.nelec) < mole.nao


def _active_level(
    task: dict[str, Any], mole: gto.Mole, share: Share, n_electrons: int, store: Store, watch: Stopwatch
) -> Solution:
    """Return CASSCF, and NEVPT2 on it, in the fragment's share of the space.

    A share that allows one determinant only is that determinant; closed, the perturbation is MP2.
    """
    spec = {**task["spec"], "reference": "ROHF" if mole.spin else "RHF"}
    field = _determinant(task, spec, store)
    single = _n_determinants(share.n_active, n_electrons, mole.spin) == 1
    if not field.converged or (single and mole.spin == 0):
        method = "MP2" if task["correlation"] == "NEVPT2" else "none"
        return _on_determinant({**task, "spec": spec, "correlation": method}, mole, field, store, watch)
    sizes = np.array([share.n_inactive, share.n_active, n_electrons])
    record = _optimised(task, mole, share, sizes, field, single)
    if record.status != "converged" or task["correlation"] == "none" or not _correlates(mole, 0):
        return _as_solution(task, record)
    solution = METHODS["NEVPT2"]({**task, "fragments": []}, field, record, 0, store)
    solution.correlation = "NEVPT2"
    return solution


def _n_determinants(n_orbitals: int, n_electrons: int, unpaired: int) -> int:
    alpha = (n_electrons + unpaired) // 2
    return comb(n_orbitals, alpha) * comb(n_orbitals, n_electrons - alpha)


def _optimised(
    task: dict[str, Any],
    mole: gto.Mole,
    share: Share,
    sizes: Array,
    field: Any,
    single: bool,
) -> Record:
    """Return the CASSCF as a record: from the share's orbitals, or, if higher, from the determinant's."""
    mc = _converge(task, mole, sizes, field.mo_coeff if single else share.coeff, orbital_step=not single)
    if not single and not (mc.converged and mc.e_tot < field.e_tot + _ROOM):
        other = _converge(task, mole, sizes, field.mo_coeff, orbital_step=True)
        mc = other if other.converged and other.e_tot < mc.e_tot else mc
    root, _ = root_overlap(mole)
    record = Record(task["key"], "fragment", "converged" if mc.converged else "unconverged")
    record.arrays = {
        "positions": np.array(task["positions"]),
        "mo_lowdin": (root @ mc.mo_coeff)[None],
        "ci": np.array([mc.ci]),
        "active": sizes,
        "state_energies": np.array([float(mc.e_tot)]),
    }
    return record


def _converge(task: dict[str, Any], mole: gto.Mole, sizes: Array, coeff: Array, orbital_step: bool) -> Any:
    mc = casci_object(mole, task["spec"], sizes, orbital_step)
    mc.kernel(coeff)
    return mc if mc.converged or not orbital_step else second_order_casscf(mole, task["spec"], sizes, mc)


def _as_solution(task: dict[str, Any], record: Record) -> Solution:
    solution = finish_casscf(task, record)
    return replace(solution, converged=record.status == "converged")


def _record(solution: Solution, task: dict[str, Any], watch: Stopwatch) -> Record:
    record = record_of(solution, "fragment", task, watch, diagnose=False)
    record.stage = "fragment"
    if solution.s2 is not None:
        record.diagnostics["s2"] = float(solution.s2)
    kept = ("positions", "natural_occupations")
    record.arrays = {name: array for name, array in record.arrays.items() if name in kept}
    return record


def _bare(task: dict[str, Any], mole: gto.Mole, watch: Stopwatch) -> Record:
    """Return the record of nuclei without electrons."""
    record = _empty(task, watch)
    record.scalars |= {"energy": float(mole.energy_nuc()), "n_basis": int(mole.nao)}
    record.stamp = "bare"
    return record


def _skipped(task: dict[str, Any], watch: Stopwatch, reason: str, words: str) -> Record:
    record = _empty(task, watch)
    record.status, record.reason, record.message = "skipped", reason, words
    return record


def _empty(task: dict[str, Any], watch: Stopwatch) -> Record:
    return Record(
        key=task["key"],
        kind="fragment",
        status="converged",
        stage="fragment",
        attempts=task.get("attempt", 1),
        inputs=inputs_of(task),
        scalars=dict(watch.cost()),
        provenance=provenance(watch),
        arrays={"positions": np.array(task["positions"])},
    )
