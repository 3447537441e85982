"""What the flag rests on: families of diagnostics, their weights, and the limits of the labels.

The rule.  Each known diagnostic has a grade from 0 (within its threshold) over 1 (at it) to 2 (strong), on
straight lines in between (:meth:`.types.Threshold.grade`).  Diagnostics that see the same
thing form a family; a family's grade is the weighted mean of its known members', its weight the
largest of theirs.  The mean grade of the point is the weighted mean over the families:

    below 0.5 -> single-reference,   below 1.5 -> borderline,   1.5 and more -> multireference.

Weight 1 have the diagnostics that were found to agree along stretched bonds (triplet stability, frontier
natural occupations of CASSCF, CCSD and UHF, D2); weight 1/2 the erratic ones: T1 falls again for
stretched F2, C0^2 and M and entropies depend on the size of the space, N_FOD on that of the molecule.

Two conditions besides.  Multireference needs a sign of weight 1 that is more than half way to strong and is
not the triplet stability eigenvalue: that one alone is at most borderline, as a determinant can be unstable
where coupled cluster on it is still sound.  And knowledge of less than weight 1 in total says nothing:
undetermined.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace

AGREEING, ERRATIC = 1.0, 0.5

FAMILIES: dict[str, dict[str, float]] = {
    "symmetry breaking": {
        "triplet_stability": AGREEING,
        "uhf_luno": AGREEING,
        "uhf_hono": AGREEING,
        "s2_excess": ERRATIC,
    },
    "active space": {
        "luno": AGREEING,
        "hono": AGREEING,
        "c0_squared": ERRATIC,
        "m_diagnostic": ERRATIC,
        "z_s1": ERRATIC,
    },
    "coupled-cluster density": {"cc_luno": AGREEING, "cc_hono": AGREEING},
    "pair amplitudes": {"d2": AGREEING, "largest_t2": ERRATIC},
    "single excitations": {"t1": ERRATIC, "d1": ERRATIC},
    "triples": {"triples_share": ERRATIC, "tae_share": ERRATIC},
    "density functionals": {"n_fod": ERRATIC, "b1": ERRATIC},
}

NEVER_ALONE = "triplet_stability"
"""The sign that cannot make a point multireference by itself."""

CLEAR = 1.5
"""Grade that one sign of weight 1 must reach for multireference."""

_PRACTICE = "this project's choice, fitted to nothing: labels are the nearest whole grade"


@dataclass(frozen=True)
class Rule:
    """Weights by diagnostic, the two limits of the mean grade, and where they come from."""

    weights: Mapping[str, float] = field(
        default_factory=lambda: {n: w for members in FAMILIES.values() for n, w in members.items()}
    )
    borderline: float = 0.5
    multireference: float = 1.5
    source: str = _PRACTICE

    def weight(self, diagnostic: str) -> float:
        """Weight of a diagnostic in its family, 0 for one that is only shown."""
        return self.weights.get(diagnostic, 0.0)


RULE = Rule()


def changed(
    rule: Rule, weights: Mapping[str, float], limits: tuple[float, float] | None, source: str
) -> Rule:
    """Return the rule with a campaign's own weights and limits.

    Raises:
        ValueError: a weight for a diagnostic that no family holds, or limits out of order.
    """
    unknown = sorted(set(weights) - rule.weights.keys())
    if unknown:
        raise ValueError(f"diagnostics.weights: {', '.join(unknown)} are in no family of the rule")
    low, high = limits or (rule.borderline, rule.multireference)
    if not 0.0 < low < high <= 2.0:
        raise ValueError(f"diagnostics.rule: limits {low}, {high} must rise between 0 and 2")
    merged = {**rule.weights, **weights}
    return replace(rule, weights=merged, borderline=low, multireference=high, source=source or rule.source)


LABELS = {
    "triplet_stability": "triplet stability",
    "uhf_luno": "UHF LUNO",
    "uhf_hono": "UHF HONO",
    "s2_excess": "<S^2> excess",
    "luno": "LUNO",
    "hono": "HONO",
    "c0_squared": "C0^2",
    "m_diagnostic": "M",
    "z_s1": "Z_s(1)",
    "cc_luno": "CCSD LUNO",
    "cc_hono": "CCSD HONO",
    "d2": "D2",
    "largest_t2": "largest T2",
    "t1": "T1",
    "d1": "D1",
    "triples_share": "(T) share in percent",
    "tae_share": "(T) share of binding in percent",
    "n_fod": "N_FOD",
    "b1": "B1",
}
"""How reasons call the diagnostics that the rule weighs."""
