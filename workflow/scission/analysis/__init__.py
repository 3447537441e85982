"""The last step of a campaign: records, thresholds, verdicts and curves joined into tables."""

from scission.analysis.campaign import Analysis, analyse

__all__ = ["Analysis", "analyse"]
