"""Handing results on: frames, labelled arrays, geometries and open packages of finished campaigns.

``open_campaign`` gives one campaign, ``concat`` several as one, ``compare`` two side by side;
``write_package`` puts tables into a folder that describes itself.  All of it reads what gathering and
analysing have written, never single records.
"""

from scission.handover.combine import Campaigns, compare, concat
from scission.handover.opened import OpenCampaign, open_campaign
from scission.handover.package import write_package

__all__ = ["Campaigns", "OpenCampaign", "compare", "concat", "open_campaign", "write_package"]
