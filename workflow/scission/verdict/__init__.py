"""Verdicts on points: flags with reasons in words, and the lengths where diagnostics cross."""

from scission.verdict.flags import FAMILIES, Context, Flag, judge
from scission.verdict.onsets import Onset, onsets

__all__ = ["FAMILIES", "Context", "Flag", "Onset", "judge", "onsets"]
