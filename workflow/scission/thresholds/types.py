"""What a threshold is, and how far a value lies beyond one."""

from dataclasses import dataclass
from typing import Literal

Direction = Literal["above", "below"]
Spin = Literal["any", "singlet", "open-shell"]

FOUND = "read in a secondary copy of the source"
MEMORY = "from memory"
PRACTICE = "common practice, no source"
OWN = "this project's choice"

_NEAR = 0.2


@dataclass(frozen=True)
class Threshold:
    """A threshold of one diagnostic, in the diagnostic's own unit.

    ``direction`` is the side on which doubt lies; ``spin`` the molecules it applies to.  With
    ``per_spin`` the values are fractions of S(S+1).  ``strong_source`` belongs to ``strong``.  Where ``near``
    is not given it lies a fifth of the value before it; where ``strong`` is not, five times as far beyond as
    ``near`` lies before (both this project's choice, as is every ``near``).  ``doubt`` is for a threshold
    that is crossed before there is reason to doubt: the stability of a determinant.
    """

    name: str
    value: float
    direction: Direction
    valid_for: str
    source: str
    provenance: str
    spin: Spin = "any"
    strong: float | None = None
    strong_source: str = ""
    per_spin: bool = False
    near: float | None = None
    doubt: float | None = None

    def scaled(self, multiplicity: int) -> tuple[float, float | None]:
        """Value and strong value for a spin multiplicity."""
        if not self.per_spin:
            return self.value, self.strong
        s = (multiplicity - 1) / 2.0
        factor = s * (s + 1.0)
        return self.value * factor, None if self.strong is None else self.strong * factor

    def steps(self, multiplicity: int) -> tuple[float, float, float]:
        """Where the grade of a value leaves 0, is 1 and reaches 2, for a spin multiplicity."""
        value, strong = self.scaled(multiplicity)
        sign = 1.0 if self.direction == "above" else -1.0
        near = value - sign * _NEAR * abs(value) if self.near is None else self.near
        doubt = value if self.doubt is None else self.doubt
        return near, doubt, doubt + 5.0 * (doubt - near) if strong is None else strong

    def grade(self, x: float, multiplicity: int) -> float:
        """How far a value speaks against a single reference, 0 to 2.

        Straight lines between 0 (up to ``near``), 1 (at the threshold, or at ``doubt``) and 2 (from
        ``strong`` on).
        """
        near, value, strong = self.steps(multiplicity)
        if self.direction == "below":
            x, near, value, strong = -x, -near, -value, -strong
        if x <= value:
            return max(0.0, 1.0 - (value - x) / (value - near)) if value > near else float(x >= value)
        return min(2.0, 1.0 + (x - value) / (strong - value))
