"""How levels and verdicts look: each told apart by colour, dash and marker, so that grey is enough."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

# Ordered from dark to light; hue differs along blue and orange only, which every eye tells apart.
_COLOURS = ("#10243e", "#9c3a0a", "#2a6fb0", "#d98a1f", "#79a9c9", "#6b4a2b")
_DASHES: tuple[tuple[float, ...], ...] = (
    (),
    (5, 1.6),
    (1.2, 1.4),
    (6, 1.6, 1.2, 1.6),
    (3, 1),
    (8, 2, 2, 2, 2, 2),
)
_MARKERS = ("o", "s", "^", "D", "v", "p", "h", "<", ">")

OVER_SHADE = "#ececec"
INK = "#222222"
THRESHOLD_DASHES = (0.0, (4.0, 2.0))


@dataclass(frozen=True)
class Look:
    """Colour, dash pattern and marker of one level."""

    colour: str
    dashes: tuple[float, ...]
    marker: str

    @property
    def line(self) -> tuple[float, tuple[float, ...]] | Literal["-"]:
        """Line style as matplotlib takes it."""
        return (0.0, self.dashes) if self.dashes else "-"

    def face(self, flag: str) -> str:
        """Fill of a marker: full where one determinant is enough, none where it is not."""
        return {"single-reference": self.colour, "borderline": "#c9c9c9"}.get(flag, "white")


def looks(levels: list[str]) -> dict[str, Look]:
    """A look for each level; the three lists have coprime enough lengths that 18 levels differ."""
    return {
        name: Look(
            _COLOURS[i % len(_COLOURS)], _DASHES[(i + i // 6) % len(_DASHES)], _MARKERS[i % len(_MARKERS)]
        )
        for i, name in enumerate(levels)
    }
