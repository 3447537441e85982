"""The last step of a campaign: records, thresholds, verdicts and curves joined into tables."""

from scission.analysis.campaign import Analysis, analyse
from scission.analysis.handing_on import hand_on, take_over

__all__ = ["Analysis", "analyse", "hand_on", "take_over"]
