"""The flag of a point: how far its diagnostics speak against a single reference.

The rule.  Diagnostics that see the same thing form a family and are counted once, by the
strongest of them.  Over its threshold a diagnostic scores its weight, over its strong value
twice that.  The ones that were found to agree along stretched bonds have weight 1 (triplet
stability, CASSCF and UHF natural occupations, D2), the erratic ones 1/2 (T1, D1, largest T2,
share of (T)).  With the sum over the families,

    0 -> single-reference,   below 2 -> borderline,   2 and more -> multireference,

so that it takes two independent signs or a strong one.  Nothing known -> undetermined.
The flag speaks of the molecule at a geometry; whether a level can cope with it is another question:
CASSCF and full CI can.
"""

from collections.abc import Mapping
from dataclasses import dataclass, field
from math import isfinite

from scission.thresholds import Threshold, Thresholds, is_over, threshold_for

SINGLE = "single-reference"
BORDERLINE = "borderline"
MULTI = "multireference"
UNDETERMINED = "undetermined"

FULL, ERRATIC = 1.0, 0.5
ENOUGH = 2.0

FAMILIES: dict[str, dict[str, float]] = {
    "symmetry breaking": {
        "triplet_stability": FULL,
        "uhf_luno": FULL,
        "uhf_hono": FULL,
        "s2_excess": ERRATIC,
    },
    "CASSCF wavefunction": {"luno": FULL, "hono": FULL, "c0_squared": FULL, "m_diagnostic": FULL},
    "pair amplitudes": {"d2": FULL, "largest_t2": ERRATIC},
    "single excitations": {"t1": ERRATIC, "d1": ERRATIC},
    "triples": {"triples_share": ERRATIC},
}

LABELS = {
    "t1": "T1",
    "d1": "D1",
    "d2": "D2",
    "largest_t2": "largest T2",
    "triples_share": "share of (T) in percent",
    "s2_excess": "<S^2> excess",
    "uhf_luno": "UHF LUNO",
    "uhf_hono": "UHF HONO",
    "luno": "LUNO",
    "hono": "HONO",
    "c0_squared": "C0^2",
    "m_diagnostic": "M",
    "triplet_stability": "triplet stability",
}


@dataclass(frozen=True)
class Context:
    """What a verdict knows besides the point's own values.

    ``evidence`` holds values of the same geometry from other levels of the scan, as
    (value, name of the level); a point's own value of the same diagnostic goes first.
    """

    multiplicity: int = 1
    evidence: Mapping[str, tuple[float, str]] = field(default_factory=dict)


@dataclass(frozen=True)
class Flag:
    """A label and the reasons for it in words, the weightiest first; ``score`` is the sum of the rule."""

    label: str
    reasons: list[str]
    score: float = 0.0


def judge(values: Mapping[str, float], thresholds: Thresholds, context: Context | None = None) -> Flag:
    """Judge one point; NaN values and diagnostics without a threshold or a family count as unknown."""
    context = context or Context()
    known = _known(values, context)
    family_scores: list[float] = []
    signs: list[tuple[float, str]] = []
    checked: list[str] = []
    for members in FAMILIES.values():
        scores = [0.0]
        for name, weight in members.items():
            threshold = threshold_for(name, context.multiplicity, thresholds)
            if name not in known or threshold is None:
                continue
            checked.append(LABELS[name])
            grade, words = _grade(known[name], threshold, context.multiplicity)
            scores.append(weight * grade)
            signs += [(weight * grade, words)] if grade else []
        family_scores.append(max(scores))
    if not checked:
        return Flag(UNDETERMINED, ["no diagnostic with a threshold is known for this point"])
    return _flag(sum(family_scores), signs, checked)


def _known(values: Mapping[str, float], context: Context) -> dict[str, tuple[float, str]]:
    """Finite values by name, with the level they were borrowed from ('' for the point's own)."""
    borrowed = {name: found for name, found in context.evidence.items() if isfinite(found[0])}
    return borrowed | {name: (value, "") for name, value in values.items() if isfinite(value)}


def _grade(found: tuple[float, str], threshold: Threshold, multiplicity: int) -> tuple[int, str]:
    """0, 1 or 2 and the comparison in words, such as ``LUNO 0.23 > 0.10 (level cas)``."""
    value, level = found
    bound, strong = threshold.scaled(multiplicity)
    if not is_over(value, bound, threshold.direction):
        return 0, ""
    grade = 2 if strong is not None and is_over(value, strong, threshold.direction) else 1
    shown = strong if grade == 2 and strong is not None else bound
    sign = ">" if threshold.direction == "above" else "<"
    words = f"{LABELS[threshold.name]} {_number(value)} {sign} {_number(shown)}"
    return grade, words + (" (strong)" if grade == 2 else "") + (f" (level {level})" if level else "")


def _number(value: float) -> str:
    return f"{value:.2f}" if abs(value) >= 0.095 or value == 0.0 else f"{value:.2g}"


def _flag(score: float, signs: list[tuple[float, str]], checked: list[str]) -> Flag:
    if not signs:
        return Flag(SINGLE, [f"below every threshold: {', '.join(checked)}"])
    label = MULTI if score >= ENOUGH else BORDERLINE
    ordered = sorted(signs, key=lambda sign: -sign[0])
    return Flag(label, [words for _, words in ordered], score)
