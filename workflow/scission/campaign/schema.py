"""The JSON schema of a campaign file, made from the types, for editors that complete and check."""

import json
from typing import Any

from scission.campaign.model import Campaign

DRAFT = "https://json-schema.org/draft/2020-12/schema"


def campaign_schema() -> dict[str, Any]:
    """Schema of the campaign file, draft 2020-12, with a description on every key."""
    return {"$schema": DRAFT, **Campaign.model_json_schema(by_alias=True, mode="validation")}


def schema_text() -> str:
    """The schema as it lies in ``config/campaign.schema.json``."""
    return json.dumps(campaign_schema(), indent=2) + "\n"
