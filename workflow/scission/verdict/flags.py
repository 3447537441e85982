"""The flag of a point, with its reasons in words; the rule is in :mod:`scission.thresholds.rule`.

The flag speaks of the molecule at a geometry; whether a level can cope with it is another question:
CASSCF and full CI can.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from math import isfinite

from scission.thresholds import Thresholds, is_over, threshold_for
from scission.thresholds.rule import CLEAR, FAMILIES, LABELS, NEVER_ALONE, RULE, Rule

SINGLE = "single-reference"
BORDERLINE = "borderline"
MULTI = "multireference"
UNDETERMINED = "undetermined"

_ENOUGH_KNOWN = 1.0


@dataclass(frozen=True)
class Context:
    """What a verdict knows besides the point's own values.

    ``evidence`` holds values of the same geometry from other levels of the scan, as
    (value, name of the level); a point's own value of the same diagnostic goes first and is said to be of
    ``level``.
    """

    multiplicity: int = 1
    evidence: Mapping[str, tuple[float, str]] = field(default_factory=dict)
    level: str = ""


@dataclass(frozen=True)
class Sign:
    """One graded diagnostic: its weight, its grade from 0 to 2, and the comparison in words."""

    name: str
    weight: float
    grade: float
    words: str


@dataclass(frozen=True)
class Flag:
    """A label, the reasons for it in words, the weightiest first, and the mean grade (NaN for none)."""

    label: str
    reasons: list[str]
    grade: float = float("nan")
    signs: tuple[Sign, ...] = ()


def judge(
    values: Mapping[str, float], thresholds: Thresholds, context: Context | None = None, rule: Rule = RULE
) -> Flag:
    """Judge one point; NaN values and diagnostics without a threshold or a family count as unknown."""
    context = context or Context()
    known = _known(values, context)
    families = [
        [s for name in members if (s := _sign(name, known, thresholds, context, rule))]
        for members in FAMILIES.values()
    ]
    families = [signs for signs in families if signs]
    signs = tuple(sorted((s for f in families for s in f), key=lambda s: -s.weight * s.grade))
    total = sum(max(s.weight for s in f) for f in families)
    if total < _ENOUGH_KNOWN:
        names = ", ".join(LABELS[s.name] for s in signs) or "no diagnostic with a threshold"
        return Flag(UNDETERMINED, [f"too little is known of this point: {names}"], signs=signs)
    grade = sum(max(s.weight for s in f) * _family_grade(f) for f in families) / total
    return _flag(grade, signs, rule)


def _known(values: Mapping[str, float], context: Context) -> dict[str, tuple[float, str]]:
    """Finite values by name, with the level that each comes from."""
    borrowed = {name: found for name, found in context.evidence.items() if isfinite(found[0])}
    return borrowed | {name: (value, context.level) for name, value in values.items() if isfinite(value)}


def _sign(
    name: str, known: Mapping[str, tuple[float, str]], thresholds: Thresholds, context: Context, rule: Rule
) -> Sign | None:
    threshold = threshold_for(name, context.multiplicity, thresholds)
    if name not in known or threshold is None or rule.weight(name) == 0.0:
        return None
    value, level = known[name]
    grade = threshold.grade(value, context.multiplicity)
    bound = threshold.scaled(context.multiplicity)[0]
    sign = ">" if threshold.direction == "above" else "<"
    over = is_over(value, bound, threshold.direction)
    relation = f"{sign} {_number(bound)}" if over else f"near {_number(bound)}"
    remarks = [*(["strong"] if grade >= 2.0 else []), *([f"level {level}"] if level else [])]
    words = f"{LABELS[name]} {_number(value)} {relation}" + (f" ({', '.join(remarks)})" if remarks else "")
    return Sign(name, rule.weight(name), grade, words)


def _family_grade(signs: list[Sign]) -> float:
    return sum(s.weight * s.grade for s in signs) / sum(s.weight for s in signs)


def _number(value: float) -> str:
    return f"{value:.2f}" if abs(value) >= 0.095 or value == 0.0 else f"{value:.2g}"


def _flag(grade: float, signs: tuple[Sign, ...], rule: Rule) -> Flag:
    raised = [s for s in signs if s.grade > 0.0]
    label = SINGLE if grade < rule.borderline else BORDERLINE if grade < rule.multireference else MULTI
    clear = [s for s in signs if s.weight >= 1.0 and s.grade >= CLEAR and s.name != NEVER_ALONE]
    reasons = [s.words for s in raised]
    if label == MULTI and not clear:
        label = BORDERLINE
        reasons.append("no more than borderline: no frontier occupation and no D2 is far over its threshold")
    quiet = [LABELS[s.name] for s in signs if s.grade == 0.0]
    if quiet:
        reasons.append(
            f"within {'their' if raised else 'every'} threshold{'s' if raised else ''}: {', '.join(quiet)}"
        )
    reasons.append(f"mean grade {grade:.2f} of 2")
    return Flag(label, reasons, grade, signs)
