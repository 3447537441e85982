"""What depends on geometry and basis alone, computed once and shared by all that is done at a geometry.

A geometry is visited many times: from several neighbours, for its stability, its diagnostics, by several
levels.  Repulsion integrals and integration grids are the same each time.
"""

from __future__ import annotations

from collections import OrderedDict
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pyscf import dft, gto
from pyscf.gto.mole import PTR_ENV_START

Array = NDArray[np.float64]

KEPT_BYTES = 256e6
"""Integrals kept in a process; those of the latest geometry are kept whatever their size."""

_GRIDS_KEPT = 32

_repulsion: OrderedDict[bytes, Array] = OrderedDict()
_grids: OrderedDict[bytes, Any] = OrderedDict()


def share(field: Any) -> Any:
    """Give a mean field the integrals and the grid of its geometry; return the field.

    Integrals that do not fit the engine's memory are left to the engine, which then computes them as it goes.
    """
    key = _fingerprint(field.mol)
    if key in _repulsion or field._is_mem_enough():
        field._eri = _integrals(key, field.mol)
    if hasattr(field, "grids"):
        field.grids = _grid(key, field.grids)
    return field


def forget() -> None:
    """Drop everything that is kept, as a fresh process has it."""
    _repulsion.clear()
    _grids.clear()


def _integrals(key: bytes, mole: gto.Mole) -> Array:
    """Return (pq|rs) with eightfold symmetry, packed, as the engine keeps it."""
    if key in _repulsion:
        _repulsion.move_to_end(key)
        return _repulsion[key]
    size = mole.nao * (mole.nao + 1) // 2
    _make_room(size * (size + 1) // 2 * 8)
    _repulsion[key] = mole.intor("int2e", aosym="s8")
    return _repulsion[key]


def _make_room(n_bytes: float) -> None:
    held = sum(integrals.nbytes for integrals in _repulsion.values())
    while _repulsion and held + n_bytes > KEPT_BYTES:
        _, oldest = _repulsion.popitem(last=False)
        held -= oldest.nbytes


def _grid(key: bytes, fresh: dft.gen_grid.Grids) -> dft.gen_grid.Grids:
    if key not in _grids:
        _grids[key] = fresh.build(with_non0tab=True)
        if len(_grids) > _GRIDS_KEPT:
            _grids.popitem(last=False)
    _grids.move_to_end(key)
    return _grids[key]


def _fingerprint(mole: gto.Mole) -> bytes:
    """Return what integrals depend on: nuclei, basis functions and where they are; not the electrons."""
    return mole._atm.tobytes() + mole._bas.tobytes() + mole._env[PTR_ENV_START:].tobytes()
