"""From a Solution to a record: names of scalars and arrays, provenance, cost."""

from __future__ import annotations

import hashlib
import platform
import resource
import socket
import time
from dataclasses import dataclass, field
from datetime import UTC, datetime
from functools import lru_cache
from pathlib import Path
from typing import Any

import h5py
import numpy as np
import pyscf

import scission
from scission.diagnostics import evaluate_all
from scission.physics import PHYSICS_VERSION
from scission.records.store import Record
from scission.solution import Solution

from .guards import violation

_ENERGY_NAMES = {
    "reference": "energy_reference",
    "correlation": "energy_correlation",
    "triples": "energy_triples",
    "nuclear": "energy_nuclear",
}


@dataclass
class Stopwatch:
    """Wall and processor time since it was made."""

    started: datetime = field(default_factory=lambda: datetime.now(UTC))
    wall: float = field(default_factory=time.monotonic)
    cpu: float = field(default_factory=time.process_time)

    def cost(self) -> dict[str, float]:
        """Return wall_s, cpu_s and peak_memory_mb up to now."""
        peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0
        return {
            "wall_s": time.monotonic() - self.wall,
            "cpu_s": time.process_time() - self.cpu,
            "peak_memory_mb": peak,
        }


def record_of(
    solution: Solution,
    kind: str,
    task: dict[str, Any],
    watch: Stopwatch,
    diagnose: bool = True,
    calculation: str = "",
) -> Record:
    """Return the record of a finished calculation; unconverged ones say so in status and message.

    ``calculation`` is the extra one that was done, a key of ``diagnostics.CALCULATIONS``; "" for none.
    """
    values, absent = evaluate_all(solution, calculation) if diagnose else ({}, {})
    scalars: dict[str, float | int] = {"energy": solution.energy, "n_basis": len(solution.overlap)}
    scalars |= {_ENERGY_NAMES[k]: v for k, v in solution.energies.items() if k in _ENERGY_NAMES}
    scalars |= solution.numbers
    if solution.n_correlated is not None:
        scalars["n_correlated"] = solution.n_correlated
    record = Record(
        key=task["key"],
        kind=kind,
        status="converged" if solution.converged else "unconverged",
        reason="" if solution.converged else "not-converged",
        message="" if solution.converged else unconverged_message(solution),
        stage="reference" if kind == "reference" else "correlate",
        attempts=task.get("attempt", 1),
        remedy=task.get("remedy", ""),
        scalars=scalars,
        diagnostics=values,
        absent=absent,
        notes=dict(solution.notes),
        inputs=inputs_of(task),
        reference_key=task.get("reference_key", ""),
        stamp=stamp(solution),
        provenance=provenance(watch),
        arrays=_arrays(solution, task),
    )
    record.scalars |= watch.cost()
    return record


def guarded(
    record: Record, solution: Solution, upper_bounds: dict[str, float], lower_bounds: dict[str, float]
) -> Record:
    """Return the record, turned into a failed one if the solution breaks a bound or has the wrong spin."""
    broken = violation(solution, upper_bounds, lower_bounds)
    if broken is not None and record.status == "converged":
        record.status, (record.reason, record.message) = "failed", broken
    return record


def unconverged_message(solution: Solution) -> str:
    """Return one line that says what did not converge, and the energy it ended at."""
    what = solution.reference if solution.correlation == "none" else solution.correlation
    if not np.isfinite(solution.energy):
        return f"{what} did not converge: the iterations diverge"
    return f"{what} did not converge; last energy {solution.energy:.8f} hartree"


def inputs_of(task: dict[str, Any]) -> dict[str, Any]:
    """Return what was computed, readable: molecule, level, stretched bonds."""
    names = ("molecule", "spec", "correlation", "frozen_core", "bonds", "calculation")
    return {name: task[name] for name in names if name in task}


def stamp(solution: Solution) -> str:
    """Return a short text that changes when the numbers do (energy to 1e-8, spin to 1e-5)."""
    s2 = 0.0 if solution.s2 is None else solution.s2
    return hashlib.sha256(f"{solution.energy:.8f} {s2:.4f}".encode()).hexdigest()[:12]


def provenance(watch: Stopwatch) -> dict[str, Any]:
    """Return versions, host and times (UTC) of a calculation."""
    return {
        "scission": scission.__version__,
        "physics_version": PHYSICS_VERSION,
        "source_digest": source_digest(),
        "python": platform.python_version(),
        "numpy": np.__version__,
        "pyscf": pyscf.__version__,
        "h5py": h5py.__version__,
        "host": socket.gethostname(),
        "started": watch.started.isoformat(timespec="seconds"),
        "finished": datetime.now(UTC).isoformat(timespec="seconds"),
    }


@lru_cache(maxsize=1)
def source_digest() -> str:
    """Return a digest of the chemistry's and diagnostics' source, so that mixtures of records can be seen."""
    root = Path(scission.__file__).parent
    files = sorted([*root.glob("chemistry/**/*.py"), *root.glob("diagnostics/*.py")])
    return hashlib.sha256(b"\0".join(f.read_bytes() for f in files)).hexdigest()[:12]


def _arrays(solution: Solution, task: dict[str, Any]) -> dict[str, np.ndarray]:
    arrays = {
        "positions": np.array(task["positions"]),
        "state_energies": solution.state_energies,
        "natural_occupations": solution.natural_occupations,
        "orbital_weights": solution.orbital_weights,
        "orbital_energies": solution.mo_energy,
        "dipole": solution.dipole,
        **solution.extra,
    }
    return {name: array for name, array in arrays.items() if array is not None}
