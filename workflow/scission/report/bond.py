"""The lowest panel: what the bond is made of, as weights of its covalent and ionic structures."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import pandas as pd
from matplotlib.axes import Axes
from matplotlib.transforms import ScaledTranslation

from scission.report.style import INK, Look

_SAME = 1e-6
_NAME_AT_INCHES = -0.5


def has_bond_picture(rows: pd.DataFrame) -> bool:
    """Whether there is anything to draw."""
    return bool((rows.quantity == "bond_covalent").any())


def draw_bond(axes: Axes, rows: pd.DataFrame, looks: Mapping[str, Look]) -> None:
    """Draw the covalent weight of each level that has one: lines orthogonal, marks over fragments' orbitals.

    Levels on the same active space have the same picture and are drawn once.
    """
    drawn: list[np.ndarray] = []
    for name, look in looks.items():
        level = rows[rows.level == name].sort_values("coordinate_angstrom")
        covalent = level[level.quantity == "bond_covalent"]
        values = covalent[["coordinate_angstrom", "value"]].to_numpy()
        if not len(values) or any(_same(values, other) for other in drawn):
            continue
        drawn.append(values)
        _draw_level(axes, level, look)
    axes.set_ylim(-0.05, 1.08)
    axes.set_yticks([0.0, 0.5, 1.0])
    axes.tick_params(axis="y", labelsize=7.5)
    axes.axhline(1.0, color=INK, linewidth=0.5, zorder=0)
    _name(axes)


def _same(a: np.ndarray, b: np.ndarray) -> bool:
    return a.shape == b.shape and bool(np.allclose(a, b, atol=_SAME))


def _draw_level(axes: Axes, level: pd.DataFrame, look: Look) -> None:
    orthogonal = level[level.quantity == "bond_covalent"]
    axes.plot(
        orthogonal.coordinate_angstrom,
        orthogonal.value,
        linestyle=look.line,
        color=look.colour,
        linewidth=1.1,
    )
    own = level[level.quantity == "vb_covalent"]
    axes.plot(
        own.coordinate_angstrom,
        own.value,
        look.marker,
        markersize=3.6,
        markerfacecolor="white",
        markeredgecolor=look.colour,
        markeredgewidth=0.9,
    )


def _name(axes: Axes) -> None:
    place = axes.transAxes + ScaledTranslation(_NAME_AT_INCHES, 0, axes.figure.dpi_scale_trans)
    words = "covalent\nweight"
    axes.text(0, 0.5, words, transform=place, ha="right", va="center", fontsize=8.5, linespacing=1.0)
    axes.text(
        1.012,
        0.5,
        "line: orthog.\nmark: fragm.\norbitals",
        transform=axes.transAxes,
        va="center",
        fontsize=6.8,
        color=INK,
    )
