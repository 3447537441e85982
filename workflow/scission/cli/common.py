"""What subcommands share: finding campaign and results, telling what is wrong."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING

from scission.execution.layout import PROJECT, Layout

if TYPE_CHECKING:
    from scission.campaign import Campaign

FAULT = 1
WRONG_INPUT = 2
POINTS_FAILED = 3
DEMO = PROJECT / "config" / "demo.yaml"


class WrongInputError(Exception):
    """The input is wrong; the text says all of it, for a person."""


def tell(text: str) -> None:
    """Write a line for a person to standard error."""
    print(text, file=sys.stderr, flush=True)


def read_campaign(path: Path) -> Campaign:
    """Return the checked campaign.

    Raises:
        WrongInputError: with every problem of the file.
    """
    from scission.campaign import CampaignError, load_campaign
    from scission.diagnostics import DIAGNOSTICS

    try:
        return load_campaign(path, DIAGNOSTICS)
    except CampaignError as error:
        n = len(error.problems)
        head = f"{path}: {n} problem{'s' if n != 1 else ''}"
        raise WrongInputError("\n".join([head, *(f"  {problem}" for problem in error.problems)])) from None


def results_folder(given: Path | None) -> Path:
    """Return the folder for results: the given one, or the project's own."""
    return given.expanduser().absolute() if given else PROJECT / "results"


def find_layout(name: str | None, results: Path) -> Layout:
    """Return the layout of a campaign given by its file, its name or its results folder.

    Raises:
        WrongInputError: no such campaign has been started.
    """
    candidates = []
    if name is None:
        name = str(DEMO)
    path = Path(name)
    if path.suffix in (".yaml", ".yml"):
        candidates.append(results / read_campaign(path).name)
    else:
        candidates += [path.absolute(), results / name]
    for folder in candidates:
        if (folder / "plan" / "plan.json").is_file():
            return Layout(folder)
    raise WrongInputError(f"no results of {name!r} yet (looked for {', '.join(map(str, candidates))})")
