"""Reading and checking a campaign file."""

from collections.abc import Collection
from pathlib import Path
from typing import Any

from scission.campaign import yaml_text
from scission.campaign.checks_levels import check_levels
from scission.campaign.checks_molecules import check_molecules
from scission.campaign.checks_names import check_analysis, check_names, check_references
from scission.campaign.checks_scans import check_scans
from scission.campaign.checks_together import check_together
from scission.campaign.model import Campaign
from scission.campaign.parts import read_parts
from scission.campaign.problems import CampaignError, Problem
from scission.diagnostics import DIAGNOSTICS

_ORDER = ["campaign", *Campaign.model_fields]


def load_campaign(path: Path, diagnostic_names: Collection[str] = tuple(DIAGNOSTICS)) -> Campaign:
    """The campaign in a YAML file, checked whole.

    ``diagnostic_names`` are the diagnostics that thresholds may be given for.

    Raises
    ------
    CampaignError
        With every problem of the file: its text, types, and what does not fit together.
    """
    raw = _read(Path(path))
    data, problems = yaml_text.parse(raw)
    if data is None and problems:
        raise CampaignError(problems)
    campaign, found = check_data(data, Path(path).parent, diagnostic_names)
    if campaign is None or problems or found:
        raise CampaignError(problems + found)
    campaign.keep_source(raw.decode("utf-8-sig"), Path(path).parent)
    return campaign


def _read(path: Path) -> bytes:
    try:
        with path.open("rb") as file:
            return file.read(yaml_text.LARGEST_FILE + 1)
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) else str(error)
        raise CampaignError([Problem("campaign file", str(path), f"cannot be read: {reason}")]) from error


def check_data(
    data: Any, directory: Path, diagnostic_names: Collection[str] = tuple(DIAGNOSTICS)
) -> tuple[Campaign | None, list[Problem]]:
    """The campaign in plain data (None where its types are wrong) and all its problems, by section."""
    if not isinstance(data, dict):
        return None, [
            Problem("campaign file", data, "must be a mapping with campaign, molecules, levels and scans")
        ]
    parts, problems = read_parts(data, directory)
    problems += check_names(parts)
    problems += check_molecules(parts)
    problems += check_levels(parts)
    problems += check_references(parts)
    problems += check_together(parts)
    problems += check_scans(parts)
    problems += check_analysis(parts, diagnostic_names)
    return parts.campaign, sorted(problems, key=_section)


def _section(problem: Problem) -> int:
    section = problem.path.partition(".")[0]
    return _ORDER.index(section) if section in _ORDER else -1
