"""How large a campaign may be before a person has to say that it is meant so."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING

from scission.cli.common import WrongInputError

if TYPE_CHECKING:
    from scission.campaign import Campaign
    from scission.forecast import Forecast

MOST_POINTS = 200_000
MOST_CORE_HOURS = 20_000.0


def add_limits(parser: argparse.ArgumentParser) -> None:
    """Declare the options that raise the limits."""
    parser.add_argument(
        "--most-points",
        type=int,
        default=MOST_POINTS,
        metavar="N",
        help=f"points above which a campaign is refused (default: {MOST_POINTS})",
    )
    parser.add_argument(
        "--most-core-hours",
        type=float,
        default=MOST_CORE_HOURS,
        metavar="H",
        help=f"forecast core hours above which it is refused (default: {MOST_CORE_HOURS:.0f})",
    )


def within_points(campaign: Campaign, args: argparse.Namespace) -> None:
    """Refuse a campaign of too many points, before they are built.

    Raises:
        WrongInputError: with the number, the limit and how to raise it.
    """
    from scission.campaign.checks_scans import number_of_lengths

    n = sum(number_of_lengths(scan.stretch) * len(scan.levels) for scan in campaign.scans.values())
    if n > args.most_points:
        raise WrongInputError(
            f"{campaign.name}: {n} points are more than {args.most_points}; take fewer lengths or levels, "
            f"or say that it is meant so: --most-points {n}"
        )


def within_core_hours(forecast: Forecast, args: argparse.Namespace) -> None:
    """Refuse a campaign that will take too long.

    Raises:
        WrongInputError: with the forecast, the limit and how to raise it.
    """
    hours = forecast.total.core_s / 3600
    if hours > args.most_core_hours:
        raise WrongInputError(
            f"about {hours:.0f} core hours are more than {args.most_core_hours:g}; "
            "take fewer points, smaller bases or cheaper levels, "
            f"or say that it is meant so: --most-core-hours {hours * 1.05:.0f}"
        )
