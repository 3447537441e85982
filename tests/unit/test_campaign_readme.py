"""The examples of config/README.md are campaigns that load."""

import re
from pathlib import Path
from typing import Any

import pytest
import yaml
from scission.campaign import Campaign, load_campaign
from scission.campaign.schema import campaign_schema

README = (Path(__file__).parents[2] / "config" / "README.md").read_text()
EXAMPLES = re.findall(r"```yaml\n(.*?)```", README, re.DOTALL)


def _merged() -> dict[str, Any]:
    """The whole campaign with every example after it put in."""
    whole: dict[str, Any] = yaml.safe_load(EXAMPLES[0])
    for text in EXAMPLES[1:]:
        for section, content in yaml.safe_load(text).items():
            whole[section] = {**whole.get(section, {}), **content} if isinstance(content, dict) else content
    return whole


def test_the_whole_campaign_loads_as_it_stands(tmp_path: Path) -> None:
    """The first example needs nothing else."""
    (tmp_path / "c.yaml").write_text(EXAMPLES[0])

    assert isinstance(load_campaign(tmp_path / "c.yaml"), Campaign)


def test_all_examples_load_together(tmp_path: Path) -> None:
    """The examples of the keys fit into the whole campaign."""
    (tmp_path / "c.yaml").write_text(yaml.safe_dump(_merged(), sort_keys=False))
    campaign = load_campaign(tmp_path / "c.yaml")

    assert list(campaign.scans) == ["one-oh", "other-oh", "radical"]
    assert campaign.reference_level == "cc"


def _keys() -> list[str]:
    schema = campaign_schema()
    blocks = [schema, *schema["$defs"].values()]
    return sorted({key for block in blocks for key in block["properties"]})


@pytest.mark.parametrize("key", _keys())
def test_every_key_is_explained(key: str) -> None:
    """Each key of the schema stands in the text in code type."""
    assert re.search(rf"[`{{ ]{key}[`,}} ]", README), key
