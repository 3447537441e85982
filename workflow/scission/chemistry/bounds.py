"""Energies that a reference cannot pass: from below the exact one of its basis, from above its own determinants."""

from __future__ import annotations

from math import comb
from typing import Any

import numpy as np
from pyscf import ao2mo, fci, gto

from scission.campaign.model import PICTURES
from scission.records.store import Record

from . import scf
from .orbitals import Orbitals
from .starts import carried

FEW_DETERMINANTS = 400
"""Up to so many the whole Hamiltonian is diagonalised in milliseconds, and no root can be missed."""


def upper_bounds(spec: dict[str, Any], record: Record, mole: gto.Mole) -> dict[str, float]:
    """Return energies (hartree) that the reference cannot lie above: of one active-space state the determinant's."""
    if spec["reference"] != "CASSCF" or spec.get("states", 1) > 1:
        return {}
    field = scf.converge(scf.build_field(mole, spec), _closest_determinant(record, mole))
    return {"restricted determinant": float(field.e_tot)} if field.converged else {}


def lower_bounds(spec: dict[str, Any], record: Record, mole: gto.Mole) -> dict[str, float]:
    """Return energies (hartree) that the reference cannot lie below: the exact one, where that is cheap."""
    if spec.get("functional") or spec["reference"] in PICTURES:
        return {}
    n, (alpha, beta) = mole.nao, mole.nelec
    if comb(n, alpha) * comb(n, beta) > FEW_DETERMINANTS:
        return {}
    return {"full configuration interaction": _exact(spec, mole, carried(record, mole).coeff[0])}


def _exact(spec: dict[str, Any], mole: gto.Mole, coeff: np.ndarray) -> float:
    """Return the lowest eigenvalue of all determinants of the molecule's spin projection, hartree."""
    field = scf.build_field(mole, spec)
    one = coeff.T @ field.get_hcore() @ coeff
    two = ao2mo.restore(1, ao2mo.full(field._eri, coeff), mole.nao)
    _, hamiltonian = fci.direct_spin1.pspace(one, two, mole.nao, mole.nelec, np=FEW_DETERMINANTS)
    return float(np.linalg.eigvalsh(hamiltonian)[0] + mole.energy_nuc())


def _closest_determinant(record: Record, mole: gto.Mole) -> np.ndarray:
    """Return the density of the determinant of the most occupied orbitals, as a restricted field starts from."""
    orbitals = carried(record, mole)
    order = np.argsort(-orbitals.occ[0], kind="stable")
    occ = np.zeros_like(orbitals.occ)
    occ[0, order[: mole.nelec[1]]] = 2.0
    occ[0, order[mole.nelec[1] : mole.nelec[0]]] = 1.0
    return Orbitals(orbitals.coeff, occ).density()
