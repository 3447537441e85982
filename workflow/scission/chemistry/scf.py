"""Self-consistent fields: building, starting, converging and following instabilities."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray
from pyscf import dft, gto
from pyscf.scf import hf, rohf, uhf

from .degenerate import settle_degenerate
from .integrals import share
from .orbitals import Orbitals
from .stability import (
    UNSTABLE,
    internal_instability,
    triplet_instability,
    turned_along,
    unrestricted_along,
)

Array = NDArray[np.float64]

ENERGY_TOLERANCE = 1e-10
GRADIENT_TOLERANCE = 1e-6
_POLISHED = 1e-8
MAX_CYCLES = 60
_ROUGH = 1e-5, 1e-2
"""Changes of energy (hartree) and gradients at which a field is good enough to be told from others."""
_ROUGH_CYCLES = 30

_SECOND_ORDER_CYCLES = 60
_FOLLOWED = 5
"""How often an instability is followed at most; two or three were the most seen."""

REMEDIES: dict[str, dict[str, float]] = {
    "damping": {"damp": 0.5, "diis_start_cycle": 12},
    "level-shift": {"level_shift": 0.5},
}


def build_field(mole: gto.Mole, spec: dict[str, Any]) -> Any:
    """Return the engine's mean-field object of a reference; CASSCF starts from RHF or ROHF."""
    kind = spec["reference"]
    if kind == "CASSCF":
        kind = "RHF" if mole.spin == 0 else "ROHF"
    makers = {"RHF": hf.RHF, "ROHF": rohf.ROHF, "UHF": uhf.UHF, "RKS": dft.rks.RKS, "UKS": dft.uks.UKS}
    field = makers[kind](mole)
    if spec.get("functional"):
        field.xc = spec["functional"]
    field.conv_tol = ENERGY_TOLERANCE
    field.conv_tol_grad = GRADIENT_TOLERANCE
    field.max_cycle = MAX_CYCLES
    field.chkfile = None
    return share(field)


def converge(field: Any, density: Array | None, remedy: str = "") -> Any:
    """Converge ``field`` from a density matrix (``None``: the engine's default), in two steps.

    First the usual extrapolated iterations, then, where those do not converge, the second-order solver.
    ``remedy`` changes the first step (damping, level-shift) or leaves it out (second-order).
    Returns the field; its ``converged`` tells how it went.
    """
    if remedy == "second-order":
        field.max_cycle = 5
    for name, value in REMEDIES.get(remedy, {}).items():
        setattr(field, name, value)
    try:
        field.kernel(dm0=density)
    except (AttributeError, np.linalg.LinAlgError):
        # extrapolation from linearly dependent errors; the iterations so far are still good to start from
        field.converged = False
    if field.converged and remedy != "second-order":
        return field
    if field.mo_coeff is None:
        field.mo_energy, field.mo_coeff = field.eig(field.get_fock(dm=density), field.get_ovlp())
        field.mo_occ = field.get_occ(field.mo_energy, field.mo_coeff)
    return second_order(field, field.mo_coeff, field.mo_occ)


def roughly(field: Any, density: Array) -> Any:
    """Iterate a throw-away field from a density until its energy is good to about 1e-5 hartree."""
    field.conv_tol, field.conv_tol_grad = _ROUGH
    field.max_cycle = _ROUGH_CYCLES
    field.kernel(dm0=density)
    return field


def second_order(field: Any, coeff: Array, occ: Array, gradient: float = GRADIENT_TOLERANCE) -> Any:
    """Converge with the second-order solver from orbitals; it stays near where it starts."""
    solver = field.newton()
    solver.max_cycle = _SECOND_ORDER_CYCLES
    solver.conv_tol_grad = gradient
    solver.kernel(mo_coeff=coeff, mo_occ=occ)
    field.converged, field.e_tot = bool(solver.converged), float(solver.e_tot)
    # the second-order solver leaves orbitals that are not canonical within occupied and virtual ones
    fock = field.get_fock(dm=field.make_rdm1(solver.mo_coeff, solver.mo_occ))
    field.mo_occ = solver.mo_occ
    field.mo_energy, field.mo_coeff = field.canonicalize(solver.mo_coeff, solver.mo_occ, fock)
    return field


def polish(field: Any) -> Any:
    """Turn a converged field along its flattest directions, as far as the numbers carry.

    The hole of a far atom can stay tilted against the bond at a cost of 1e-8 hartree: far below the energy
    tolerance, but coupled cluster on such orbitals need not converge.  What does not get tighter stays as it is.
    """
    finer = second_order(field.copy(), field.mo_coeff, field.mo_occ, _POLISHED)
    if finer.e_tot > field.e_tot + ENERGY_TOLERANCE:
        return field
    finer.converged = True
    return finer


def is_restricted_open(field: Any) -> bool:
    """Whether the field is a restricted open-shell one."""
    return isinstance(field, rohf.ROHF)


def has_rotations(field: Any) -> bool:
    """Whether an occupied orbital has an empty one to mix with; hydrogen in a minimal basis has none."""
    _, occ = orbitals_of(field).by_spin()
    return any(bool(np.any(o > 0.5) and np.any(o < 0.5)) for o in occ)


def follow_instability(field: Any) -> tuple[Any, float]:
    """Follow internal instabilities until none is left, five times at most.

    Returns:
        The lowest field and the last eigenvalue of its orbital Hessian that was looked at, hartree
        (infinite where no orbital can turn).
    """
    lowest = np.inf
    for _ in range(_FOLLOWED):
        if not field.converged or not has_rotations(field):
            break
        lowest, vector = internal_instability(field)
        if lowest > UNSTABLE:
            break
        lower = second_order(field.copy(), turned_along(field, vector), field.mo_occ)
        if not lower.converged or lower.e_tot > field.e_tot - 1e-8:
            break
        field = lower
    return field, lowest


def broken_symmetry_start(restricted: Any) -> Orbitals | None:
    """Return unrestricted orbitals rotated along a restricted determinant's triplet instability.

    ``None`` where the determinant is stable or not a closed shell.
    """
    if is_restricted_open(restricted) or not restricted.converged or not has_rotations(restricted):
        return None
    value, vector = triplet_instability(restricted)
    return unrestricted_along(restricted, vector) if value < UNSTABLE else None


def closed_shell_twin(field: Any) -> Any:
    """Return the restricted field with the orbitals of an unrestricted one whose spins have equal orbitals."""
    mole = field.mol
    if hasattr(field, "xc"):
        twin = dft.rks.RKS(mole)
        twin.xc = field.xc
    else:
        twin = hf.RHF(mole)
    twin.chkfile = None
    share(twin)
    twin.mo_coeff, twin.mo_energy = field.mo_coeff[0], field.mo_energy[0]
    twin.mo_occ, twin.e_tot, twin.converged = field.mo_occ[0] * 2, field.e_tot, field.converged
    return twin


def orbitals_of(field: Any) -> Orbitals:
    """Return a field's orbitals with the spin axis first."""
    coeff, occ = np.asarray(field.mo_coeff), np.asarray(field.mo_occ)
    return Orbitals(coeff, occ) if coeff.ndim == 3 else Orbitals(coeff[None], occ[None])


def put_orbitals(field: Any, orbitals: Orbitals, energy: float) -> Any:
    """Give a field finished orbitals and energy, with canonical orbital energies, as if just converged."""
    unrestricted = isinstance(field, uhf.UHF)
    coeff = orbitals.coeff if unrestricted else orbitals.coeff[0]
    occ = orbitals.occ if unrestricted else orbitals.occ[0]
    fock = field.get_fock(dm=field.make_rdm1(coeff, occ))
    field.mo_coeff, field.mo_occ = coeff, occ
    field.mo_energy, field.mo_coeff = field.canonicalize(coeff, occ, fock)
    if unrestricted:
        by_spin = zip(field.mo_energy, field.mo_coeff, occ, strict=True)
        field.mo_coeff = np.array([settle_degenerate(field.mol, *spin) for spin in by_spin])
    else:
        field.mo_coeff = settle_degenerate(field.mol, field.mo_energy, field.mo_coeff, occ)
    field.e_tot, field.converged = energy, True
    return field


def default_density(field: Any, kind: str) -> Array:
    """Return one of the engine's own starting densities (minao, atom, 1e, huckel)."""
    return field.get_init_guess(key=kind)
