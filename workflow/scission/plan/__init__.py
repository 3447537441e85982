"""From a campaign to points, identities, reference chains and jobs: everything the engine needs to know.

The plan imports no chemistry.  It is deterministic: the same campaign gives the same keys and job names,
so that running again finds what is already there.
"""

from scission.physics import PHYSICS_VERSION

from .identity import point_key, reference_key
from .make import make_plan
from .types import Chain, Job, Node, Plan, Point
from .write import campaign_digest, read_index, write_plan

__all__ = [
    "PHYSICS_VERSION",
    "Chain",
    "Job",
    "Node",
    "Plan",
    "Point",
    "campaign_digest",
    "make_plan",
    "point_key",
    "read_index",
    "reference_key",
    "write_plan",
]
