"""Thresholds of the diagnostics, and a campaign's own ones in their place.

``THRESHOLDS`` maps the name of a diagnostic to its thresholds, one a kind of molecule.  Beyond
``value`` a diagnostic casts doubt on a single reference; beyond ``strong`` it does so strongly, and from
``near`` on it is near.
"""

from collections.abc import Mapping
from dataclasses import dataclass
from math import isfinite

from scission.thresholds.table import THRESHOLDS
from scission.thresholds.types import Direction, Spin, Threshold

__all__ = [
    "THRESHOLDS",
    "Direction",
    "Override",
    "Threshold",
    "Thresholds",
    "is_over",
    "limit",
    "problems",
    "resolve",
    "threshold_for",
]


@dataclass(frozen=True)
class Override:
    """A campaign's own threshold; ``source`` is required, ``strong`` optional.

    ``direction`` is for a diagnostic without a threshold of its own, and needed there.
    """

    value: float
    source: str
    strong: float | None = None
    direction: Direction | None = None


Thresholds = Mapping[str, tuple[Threshold, ...]]


def threshold_for(name: str, multiplicity: int, thresholds: Thresholds = THRESHOLDS) -> Threshold | None:
    """The threshold of a diagnostic for a spin multiplicity; None where there is none."""
    spin: Spin = "singlet" if multiplicity == 1 else "open-shell"
    return next((t for t in thresholds.get(name, ()) if t.spin in ("any", spin)), None)


def limit(name: str, multiplicity: int, thresholds: Thresholds = THRESHOLDS) -> float:
    """The number to compare a diagnostic with, as tables show it; NaN where there is none."""
    threshold = threshold_for(name, multiplicity, thresholds)
    return float("nan") if threshold is None else threshold.scaled(multiplicity)[0]


def is_over(value: float, bound: float, direction: Direction) -> bool:
    """True where a value lies strictly on the doubtful side of a bound; False for NaN."""
    return value > bound if direction == "above" else value < bound


def problems(overrides: Mapping[str, Override]) -> list[str]:
    """Everything that is wrong with a campaign's overrides: name, value, rule, one line each."""
    found = []
    for name, override in overrides.items():
        where = f"diagnostics.thresholds.{name}"
        own = _direction(name)
        if own is None and override.direction is None:
            rule = "the diagnostic has no threshold of its own: say which side is over"
            found.append(f"{where}.direction: {rule} (above or below)")
        if own is not None and override.direction not in (None, own):
            found.append(f"{where}.direction: {override.direction} contradicts the diagnostic's own, {own}")
        if not override.source.strip():
            found.append(f"{where}.source: {override.source!r}; an override needs the source of its value")
        if not isfinite(override.value):
            found.append(f"{where}.value: {override.value} is not a finite number")
        if not _beyond(name, override):
            found.append(f"{where}.strong: {override.strong} must lie beyond value {override.value}")
    return found


def _direction(name: str) -> Direction | None:
    return THRESHOLDS[name][0].direction if name in THRESHOLDS else None


def _beyond(name: str, override: Override) -> bool:
    direction = _direction(name) or override.direction
    return override.strong is None or direction is None or is_over(override.strong, override.value, direction)


def resolve(overrides: Mapping[str, Override]) -> dict[str, tuple[Threshold, ...]]:
    """The thresholds of a campaign: an override replaces all kinds of its diagnostic by one for any spin.

    An override without ``strong`` gets the usual distance: the built-in one belongs to another value.

    Raises:
        ValueError: a missing direction or source or a value out of range; all of them at once.
    """
    found = problems(overrides)
    if found:
        raise ValueError("\n".join(found))
    resolved = dict(THRESHOLDS)
    for name, override in overrides.items():
        resolved[name] = (_overridden(name, override),)
    return resolved


def _overridden(name: str, override: Override) -> Threshold:
    return Threshold(
        name,
        override.value,
        _direction(name) or override.direction or "above",
        "as the campaign says",
        override.source,
        "set by the campaign",
        strong=override.strong,
        strong_source=override.source if override.strong is not None else "",
        near=override.value if name == "triplet_stability" else None,
        doubt=override.value - 0.03 if name == "triplet_stability" else None,
    )
