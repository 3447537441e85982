"""The JSON schema in config/ is the one the types give, and it agrees with the loader."""

import json
from pathlib import Path
from typing import Any

import pytest
import yaml
from campaigns import GOOD, changed
from jsonschema import Draft202012Validator
from scission.campaign.schema import schema_text

CONFIG = Path(__file__).parents[2] / "config"
SCHEMA = json.loads((CONFIG / "campaign.schema.json").read_text())
VALIDATOR = Draft202012Validator(SCHEMA)


def _keys() -> list[tuple[str, dict[str, Any], bool]]:
    blocks = {"Campaign": SCHEMA, **SCHEMA["$defs"]}
    return [
        (f"{name}.{key}", entry, key in block.get("required", []))
        for name, block in blocks.items()
        for key, entry in block["properties"].items()
    ]


def test_the_schema_is_up_to_date() -> None:
    """config/campaign.schema.json is what scripts/make-schema writes."""
    written = (CONFIG / "campaign.schema.json").read_text()

    assert written == schema_text(), "run .venv/bin/python scripts/make-schema"


def test_the_schema_is_valid_itself() -> None:
    """The schema keeps to JSON schema draft 2020-12."""
    Draft202012Validator.check_schema(SCHEMA)

    assert SCHEMA["$schema"].endswith("draft/2020-12/schema")


@pytest.mark.parametrize(("key", "entry", "required"), _keys(), ids=[key for key, _, _ in _keys()])
def test_every_key_is_described(key: str, entry: dict[str, Any], required: bool) -> None:
    """Each key has a description, and a default where it may be left out."""
    assert len(entry.get("description", "")) > 10, key
    assert required != ("default" in entry), key


def test_the_good_campaign_passes() -> None:
    """What the loader takes the schema takes."""
    errors = [error.message for error in VALIDATOR.iter_errors(GOOD)]

    assert errors == []


def test_optional_blocks_may_be_empty() -> None:
    """Blocks whose lines are all commented out (null) pass, as they do in the loader."""
    errors = list(
        VALIDATOR.iter_errors(changed(("diagnostics", None), ("fit", None), ("levels/cc/correlation", None)))
    )

    assert errors == []


@pytest.mark.parametrize(
    ("path", "value"),
    [
        ("title", "x"),
        ("campaign", "a/b"),
        ("molecules/water/charge", "0"),
        ("molecules/water/unit", "nm"),
        ("molecules/a b", GOOD["molecules"]["water"]),
        ("levels/cc/reference", "HF"),
        ("levels/cc/correlation", "CCSDT"),
        ("levels/cas/active_space", "all"),
        ("levels/cas/active_space/core", 1),
        ("scans/one-oh/stretch/lengths/points", 0),
        ("scans/one-oh/stretch/lengths", []),
        ("scans/one-oh/stretch/bond", ["O1"]),
        ("fit/models", ["parabola"]),
    ],
)
def test_the_schema_catches_what_a_type_can_say(path: str, value: Any) -> None:
    """An editor marks unknown keys, wrong types and words out of the list."""
    errors = list(VALIDATOR.iter_errors(changed((path, value))))

    assert errors


@pytest.mark.parametrize("file", sorted(CONFIG.glob("*.yaml")), ids=lambda file: file.name)
def test_the_shipped_campaigns_pass(file: Path) -> None:
    """Every campaign in config/ keeps to the schema."""
    errors = [error.message for error in VALIDATOR.iter_errors(yaml.safe_load(file.read_text()))]

    assert errors == []
