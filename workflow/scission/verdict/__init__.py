"""Verdicts: flags with reasons in words, onsets of diagnostics, levels compared, diagnostics scored."""

from scission.thresholds.rule import FAMILIES, RULE, Rule
from scission.verdict.comparison import Comparison, Edge, compare
from scission.verdict.flags import Context, Flag, Sign, judge
from scission.verdict.onsets import Onset, onsets
from scission.verdict.scorecard import Counts, Score, score

__all__ = [
    "FAMILIES",
    "RULE",
    "Comparison",
    "Context",
    "Counts",
    "Edge",
    "Flag",
    "Onset",
    "Rule",
    "Score",
    "Sign",
    "compare",
    "judge",
    "onsets",
    "score",
]
