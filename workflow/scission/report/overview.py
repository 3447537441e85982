"""Small tables for people: counts, flags and the few constants one looks for first."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

import pandas as pd

from scission.curves import LOCAL
from scission.records.schema import FLAGS

QUANTITIES = ("r_e", "D_e", "k_e", "omega_e", "omega_e_x_e", "B_e", "alpha_e", "omega_stretch")
_FROM_THE_WELL = ("D_e",)

CAUTION = (
    "Computed bond energies are no safety data for reactive or energetic material: "
    "follow local codes and licensed practice."
)


def counts(points: pd.DataFrame, limits: pd.DataFrame | None = None) -> pd.DataFrame:
    """One row a scan and level: points, results, failures, how many points have each flag, the far limit."""
    rows_of = [] if limits is None else limits.itertuples()
    ends = {(str(r.scan), str(r.level)): far_words(r) for r in rows_of}
    rows = []
    for (scan, level), part in points.groupby(["scan", "level"], sort=False):
        good = int((part.status == "converged").sum())
        row = {
            "scan": scan,
            "level": level,
            "points": len(part),
            "results": good,
            "no result": len(part) - good,
        }
        row |= {flag: int((part.flag == flag).sum()) for flag in FLAGS}
        rows.append(
            row | ({"far limit": ends.get((str(scan), str(level)), "")} if limits is not None else {})
        )
    return pd.DataFrame(rows)


def far_words(limit: Any) -> str:
    """A row of the table ``limits`` in a few words: where the level goes, and how far off it ends."""
    if limit.limit in ("unknown", "not separated"):
        return str(limit.limit)
    return f"{limit.limit} {round(limit.difference_kcal_per_mol, 1) + 0.0:+.1f} kcal/mol"


def far_limits(limits: pd.DataFrame) -> pd.DataFrame:
    """One row a scan and level: where the broken bond leaves it, against the separate fragments."""
    names = {
        "scan": "scan",
        "level": "level",
        "d_e_ev": "D_e to fragments / eV",
        "coordinate_angstrom": "far end / angstrom",
        "difference_kcal_per_mol": "difference / (kcal/mol)",
        "limit": "limit",
        "what": "in words",
    }
    return limits[list(names)].rename(columns=names)


def best_constants(frames: Mapping[str, pd.DataFrame]) -> pd.DataFrame:
    """One row a scan and level: constants as text with their standard errors, and the models they are from.

    D_e comes from the preferred model of the whole well, all else from the polynomial about the
    minimum where there is one.  ``remark`` is what the fits have to say, or why there is none.
    """
    rows = []
    for (scan, level), part in frames["models"].groupby(["scan", "level"], sort=False):
        fits = frames["fits"]
        fits = fits[(fits.scan == scan) & (fits.level == level)]
        rows.append({"scan": scan, "level": level} | _constants(part, fits))
    table = pd.DataFrame(rows).fillna("")
    return table[sorted(table, key=_place)]


def _place(column: object) -> int:
    """Words before and behind the constants, which come in the order of ``QUANTITIES``."""
    order = ("scan", "level", *QUANTITIES, "models", "remark")
    return order.index(str(column).split(" / ")[0])


def _constants(models: pd.DataFrame, fits: pd.DataFrame) -> dict[str, str]:
    fitted = set(models[models.status == "fitted"].model)
    if not fitted:
        return {"remark": models.message.iloc[0] if len(models) else "not fitted"}
    whole = next(iter(models[models.preferred.fillna(False)].model), "")
    near = LOCAL if LOCAL in fitted else whole
    row = {}
    for name in QUANTITIES:
        model = whole if name in _FROM_THE_WELL else near
        found = fits[(fits.model == model) & (fits.quantity == name)]
        for value, error, unit in zip(found["value"], found["stderr"], found["unit"], strict=True):
            row[f"{name} / {unit}"] = with_error(float(value), float(error))
    messages = models[models.model.isin([near, whole])].message
    return row | {"models": " + ".join(dict.fromkeys([near, whole])), "remark": "; ".join(messages.unique())}


def with_error(value: float, error: float) -> str:
    """Value with its standard error in the last digits, as 0.9170(3); four figures where there is none."""
    if not math.isfinite(value):
        return ""
    if not math.isfinite(error) or error <= 0:
        return f"{value:.5g}"
    places = min(max(-math.floor(math.log10(error)), 0), 6)
    digits = round(error * 10**places)
    if digits >= 10 and places > 0:
        places, digits = places - 1, round(error * 10 ** (places - 1))
    return f"{value:.{places}f}({digits})" if digits else f"{value:.{places}f}"


def failure_counts(failures: pd.DataFrame) -> pd.DataFrame:
    """One row a scan, level and reason: how many points, from where to where, one message."""
    grouped = failures.groupby(["scan", "level", "status", "reason"], sort=False)
    return grouped.agg(
        points=("point", "size"),
        from_angstrom=("coordinate_angstrom", "min"),
        to_angstrom=("coordinate_angstrom", "max"),
        message=("message", "first"),
    ).reset_index()
