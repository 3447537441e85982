"""The parts of a campaign that are well-formed by themselves, for the checks that compare them."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, TypeVar

from pydantic import BaseModel, ValidationError

from scission.campaign.conclusions import Diagnostics, Fit
from scission.campaign.model import Campaign, Level, Molecule, Scan
from scission.campaign.problems import Problem
from scission.campaign.translate import problems_of

Block = TypeVar("Block", bound=BaseModel)


@dataclass
class Parts:
    """Well-formed blocks by name, and the file's content for the names that were declared at all.

    A scan of a molecule that is there but malformed is no second problem, so references
    are looked up among all declared names.  ``sound_molecules`` are those whose charge and
    spin fit, so that levels are not held against a wrong number of electrons;
    ``crowded_molecules`` have atoms on top of each other, which is one problem, not one a scan.
    """

    data: Mapping[str, Any]
    directory: Path
    campaign: Campaign | None = None
    molecules: dict[str, Molecule] = field(default_factory=dict)
    levels: dict[str, Level] = field(default_factory=dict)
    scans: dict[str, Scan] = field(default_factory=dict)
    diagnostics: Diagnostics = field(default_factory=Diagnostics)
    fit: Fit = field(default_factory=Fit)
    sound_molecules: set[str] = field(default_factory=set)
    crowded_molecules: set[str] = field(default_factory=set)

    def declared(self, section: str) -> list[str]:
        """Names in a section of the file, well-formed or not."""
        block = self.data.get(section)
        return list(block) if isinstance(block, dict) else []


def read_parts(data: Mapping[str, Any], directory: Path) -> tuple[Parts, list[Problem]]:
    """Types checked block by block, so that one malformed block does not hide the problems of others."""
    try:
        campaign = Campaign.model_validate(data)
    except ValidationError as error:
        parts = Parts(data, directory)
        for section, model in (("molecules", Molecule), ("levels", Level), ("scans", Scan)):
            setattr(parts, section, _well_formed(parts, section, model))
        parts.diagnostics = _block(data.get("diagnostics") or {}, Diagnostics) or parts.diagnostics
        parts.fit = _block(data.get("fit") or {}, Fit) or parts.fit
        return parts, problems_of(error, Campaign, ())
    blocks = (campaign.molecules, campaign.levels, campaign.scans, campaign.diagnostics, campaign.fit)
    return Parts(data, directory, campaign, *blocks), []


def _well_formed(parts: Parts, section: str, model: type[Block]) -> dict[str, Block]:
    blocks = {name: _block(parts.data[section][name], model) for name in parts.declared(section)}
    return {name: block for name, block in blocks.items() if block is not None}


def _block(content: Any, model: type[Block]) -> Block | None:
    """The block, None where it is malformed (its problems come from validating the whole)."""
    try:
        return model.model_validate(content)
    except ValidationError:
        return None
