"""The campaign: what its YAML file may say, read, typed and checked whole.

``load_campaign`` gives a ``Campaign`` or raises ``CampaignError`` with every problem of the file.
"""

from scission.campaign.conclusions import Diagnostics, Fit, Threshold
from scission.campaign.electrons import Counts, count
from scission.campaign.load import load_campaign
from scission.campaign.model import (
    ActiveSpace,
    Campaign,
    Grid,
    Level,
    Molecule,
    Scan,
    Stretch,
)
from scission.campaign.names import AtomBasis, basis_on
from scission.campaign.problems import CampaignError, Problem

__all__ = [
    "ActiveSpace",
    "AtomBasis",
    "Campaign",
    "CampaignError",
    "Counts",
    "Diagnostics",
    "Fit",
    "Grid",
    "Level",
    "Molecule",
    "Problem",
    "Scan",
    "Stretch",
    "Threshold",
    "basis_on",
    "count",
    "load_campaign",
]
