"""Rows of the tables from the results of a scan, one function a table."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from typing import Any

import numpy as np

from scission.analysis.scan import LevelResult
from scission.curves import ModelFit
from scission.diagnostics import DIAGNOSTICS
from scission.records import Planned, Record, settled_scalars
from scission.records.schema import SCALARS
from scission.thresholds import Thresholds, is_over, threshold_for
from scission.units import DALTON_IN_ELECTRON_MASS, HARTREE_IN_EV, HARTREE_IN_KCAL_PER_MOL

Row = dict[str, Any]

BOND_PICTURE = tuple(f.name for f in SCALARS if f.name.startswith(("bond_", "vb_")))
"""Scalars of a record that say what the bond is made of."""


def where(point: Planned) -> Row:
    """The columns that say which point a row is about."""
    return {
        "scan": point.scan,
        "level": point.level,
        "point": point.number,
        "coordinate_angstrom": point.coordinate[0],
    }


def point_rows(result: LevelResult) -> Iterator[Row]:
    """One row a planned point, whatever happened to it."""
    energy, bottom = result.energy, result.bottom
    blank = np.full(energy.shape, np.nan)
    errors = blank if result.comparison is None else result.comparison.error
    for point, record, flag, value, error in zip(
        result.points, result.records, result.flags, energy, errors, strict=True
    ):
        scalars = settled_scalars(record)
        yield where(point) | {
            "status": record.status,
            "energy_hartree": value,
            "flag": flag.label,
            "reasons": "; ".join(flag.reasons),
            "attempts": record.attempts,
            "reason": record.reason,
            "message": record.message,
            "stage": record.stage,
            "remedy": record.remedy,
            "key": record.key,
            "relative_energy_ev": (value - bottom) * HARTREE_IN_EV,
            "energy_reference_hartree": scalars.get("energy_reference"),
            "energy_correlation_hartree": scalars.get("energy_correlation"),
            "wall_s": scalars.get("wall_s"),
            "cpu_s": scalars.get("cpu_s"),
            "peak_memory_mb": scalars.get("peak_memory_mb"),
            "mean_grade": flag.grade,
            "error_kcal_per_mol": error * HARTREE_IN_KCAL_PER_MOL,
        }


def diagnostic_rows(result: LevelResult, multiplicity: int, thresholds: Thresholds) -> Iterator[Row]:
    """One row for each diagnostic of each point: a value, or the reason why there is none."""
    for point, record in zip(result.points, result.records, strict=True):
        for name, value in record.diagnostics.items():
            yield where(point) | _judged(name, value, multiplicity, thresholds)
        for name, reason in record.absent.items():
            yield where(point) | _judged(name, np.nan, multiplicity, thresholds) | {"remark": reason}


def _judged(name: str, value: float, multiplicity: int, thresholds: Thresholds) -> Row:
    known, threshold = DIAGNOSTICS.get(name), threshold_for(name, multiplicity, thresholds)
    row: Row = {
        "diagnostic": name,
        "value": value,
        "symbol": known.symbol if known else name,
        "unit": known.unit if known else "",
    }
    if threshold is None:
        return row
    bound = threshold.scaled(multiplicity)[0]
    over = is_over(value, bound, threshold.direction) if np.isfinite(value) else None
    judged = {"threshold": bound, "over": over, "direction": threshold.direction}
    return row | judged | {"threshold_source": threshold.source}


def fit_rows(result: LevelResult, scan: str) -> Iterator[Row]:
    """One row for each quantity of each fitted model."""
    report = result.fits
    for row in report.rows if report else ():
        yield {
            "scan": scan,
            "level": result.name,
            "model": row.model,
            "quantity": row.quantity,
            "value": row.value,
            "stderr": row.stderr,
            "unit": row.unit,
            "preferred": row.model == report.preferred if report else None,
        }


def model_rows(result: LevelResult, scan: str, reduced_mass: float | None) -> Iterator[Row]:
    """One row a model: whether and why it could be fitted, and which one is preferred."""
    report = result.fits
    for fit in report.fits if report else ():
        yield {
            "scan": scan,
            "level": result.name,
            "model": fit.model,
            "status": fit.status,
            "preferred": fit.model == report.preferred if report else None,
            "points_used": int(np.sum(fit.used)),
            "reduced_mass_dalton": reduced_mass / DALTON_IN_ELECTRON_MASS if reduced_mass else None,
            "message": fit.message,
            "choice": report.reason if report else "",
        }


def residual_rows(result: LevelResult) -> Iterator[Row]:
    """One row for each point and model: its residual, or why the fit left it out."""
    for fit in result.fits.fits if result.fits else ():
        yield from _residuals(result, fit)


def _residuals(result: LevelResult, fit: ModelFit) -> Iterator[Row]:
    for point, used, why, residual in zip(
        result.points, fit.used, fit.why_left_out, fit.residual, strict=True
    ):
        yield where(point) | {
            "model": fit.model,
            "used": bool(used),
            "why_left_out": why,
            "residual_hartree": residual,
        }


def note_rows(result: LevelResult) -> Iterator[Row]:
    """One row for each different remark of a level, with the stretch of the scan it was made on."""
    places: dict[tuple[str, str], list[float]] = {}
    for point, record in zip(result.points, result.records, strict=True):
        for remark in record.notes.items():
            places.setdefault(remark, []).append(point.coordinate[0])
    for (subject, note), found in places.items():
        yield {
            "scan": result.points[0].scan,
            "level": result.name,
            "subject": subject,
            "note": note,
            "points": len(found),
            "from_angstrom": min(found),
            "to_angstrom": max(found),
        }


def state_rows(result: LevelResult) -> Iterator[Row]:
    """One row for each state of each converged point with several states."""
    for point, record in zip(result.points, result.records, strict=True):
        energies = record.arrays.get("state_energies", np.empty(0))
        if record.status != "converged" or len(energies) < 2:
            continue
        labels = record.arrays.get("state_labels", np.arange(1, len(energies) + 1))
        for state, (label, energy) in enumerate(zip(labels, energies, strict=True), start=1):
            yield where(point) | {"state": state, "label": int(label), "energy_hartree": float(energy)}


def bond_rows(result: LevelResult) -> Iterator[Row]:
    """One row for each number of the bond picture of each point.

    ``transfer_k`` is the weight of configurations with k active electrons on the first fragment.
    """
    for point, record in zip(result.points, result.records, strict=True):
        if record.status != "converged":
            continue
        numbers = {name: record.scalars[name] for name in BOND_PICTURE if name in record.scalars}
        weights = record.arrays.get("transfer_weights", np.empty(0))
        numbers |= {f"transfer_{k}": float(w) for k, w in enumerate(weights)}
        for name, value in numbers.items():
            yield where(point) | {"quantity": name, "value": value, "unit": "1"}


def failure_rows(result: LevelResult, suggest: Callable[[Record], str]) -> Iterator[Row]:
    """One row for each point without a converged result, with what to try next."""
    for point, record in zip(result.points, result.records, strict=True):
        if record.status == "converged":
            continue
        yield where(point) | {
            "stage": record.stage,
            "status": record.status,
            "reason": record.reason,
            "message": record.message,
            "attempts": record.attempts,
            "remedy": suggest(record),
            "key": record.key,
        }


def crossing_rows(result: LevelResult, crossings: Mapping[tuple[str, str], list[Row]]) -> Iterator[Row]:
    """Rows of the crossings that were reported for this level of the scan."""
    for point in result.points[:1]:
        for row in crossings.get((point.scan, point.level), []):
            yield {"scan": point.scan, "level": point.level} | row
