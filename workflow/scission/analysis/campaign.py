"""A whole campaign: every scan analysed, every table built."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from typing import Any

import pandas as pd

from scission.analysis import limits, rows
from scission.analysis.comparing import (
    Scorecard,
    add_tae_share,
    compare_levels,
    comparison_rows,
    verdict_rows,
)
from scission.analysis.onset_rows import onset_rows
from scission.analysis.provenance import Sources, provenance
from scission.analysis.scan import Bond, LevelResult, conclude
from scission.campaign import Campaign
from scission.geometry import build_path
from scission.masses import reduced_mass
from scission.records import Planned, Record, Store, recall_point
from scission.tables import COLUMNS, frame
from scission.thresholds import Override, Thresholds, resolve
from scission.thresholds.rule import RULE, Rule, changed
from scission.units import HARTREE_IN_KCAL_PER_MOL

_ARRAYS = ("state_energies", "state_labels", "transfer_weights")

Crossings = Mapping[tuple[str, str], list[dict[str, Any]]]


@dataclass(frozen=True)
class Analysis:
    """What a campaign came to.

    Attributes:
        campaign: the campaign.
        frames: table name to frame, see ``scission.tables.COLUMNS``.
        coordinates: scan to the name of its coordinate, without unit.
        provenance: name to text or number.
        mixed: what decides numbers and is not the same in all records; empty if all is one.
    """

    campaign: Campaign
    frames: dict[str, pd.DataFrame]
    coordinates: dict[str, str]
    provenance: dict[str, Any]
    mixed: list[str]

    @property
    def flags(self) -> dict[tuple[str, str, int], tuple[str, str]]:
        """(scan, level, number) to (flag, reasons), as ``records.gather`` takes them."""
        table = self.frames["points"]
        where = zip(table.scan, table.level, table.point, strict=True)
        verdicts = zip(table.flag, table.reasons, strict=True)
        return {(s, lv, int(n)): verdict for (s, lv, n), verdict in zip(where, verdicts, strict=True)}

    @property
    def n_failures(self) -> int:
        """Number of points without a converged result."""
        return len(self.frames["failures"])


def analyse(
    points: Iterable[Planned],
    campaign: Campaign,
    store: Store,
    facts: Mapping[str, Any] | None = None,
    suggest: Callable[[Record], str] | None = None,
    crossings: Crossings | None = None,
) -> Analysis:
    """Join plan, records, verdicts and fits into tables; reads records, computes no chemistry.

    Args:
        points: every planned point, in any order.
        campaign: for levels, molecules, thresholds and fit models.
        store: the records.
        facts: of the plan, for the provenance: ``physics_version``, ``digest``.
        suggest: remedy to try next for a record that is not converged; None or "" leaves it to the
            ladder of remedies.
        crossings: (scan, level) to rows of the crossings table, without scan and level.

    Raises:
        OSError: a record is there but cannot be read.
    """
    tables: dict[str, list[dict[str, Any]]] = {name: [] for name in COLUMNS}
    sources = Sources()
    thresholds, rule = resolve(_overrides(campaign)), _rule(campaign)
    tolerance = campaign.comparison.tolerance_kcal_per_mol
    card = Scorecard(tolerance / HARTREE_IN_KCAL_PER_MOL)
    coordinates = {}
    for scan, members in _by_scan(points).items():
        coordinates[scan] = next(iter(members.values()))[0].names[0]
        results = [_load(name, group, campaign, store, sources) for name, group in members.items()]
        molecule = campaign.molecules[campaign.scans[scan].molecule]
        bond = _bond(campaign, scan)
        sums = {r.name: limits.fragment_sums(campaign, scan, r.level, store) for r in results}
        for result in results:
            result.fragment_sum = sums[result.name].neutral
            result.fragment_triples = sums[result.name].triples
            add_tae_share(result)
        conclude(results, molecule.multiplicity, thresholds, bond, campaign.fit.models, rule)
        compare_levels(results, campaign.reference_level, tolerance / HARTREE_IN_KCAL_PER_MOL)
        card.add(results, molecule.multiplicity, thresholds)
        for result in results:
            _add(tables, scan, result, molecule.multiplicity, thresholds, bond)
            tables["verdicts"] += verdict_rows(result, scan)
            tables["comparison"] += comparison_rows(result, scan, campaign.reference_level or "", tolerance)
            _add_limits(tables, scan, result, sums[result.name], molecule.multiplicity)
            tables["failures"] += rows.failure_rows(result, suggest or _no_remedy)
            tables["crossings"] += rows.crossing_rows(result, crossings or {})
    tables["scorecard"] += card.rows(thresholds)
    frames = {name: frame(name, content) for name, content in tables.items()}
    made = provenance(campaign, facts or {}, sources)
    return Analysis(campaign, frames, coordinates, made, sources.mixed())


def _add_limits(
    tables: dict[str, list[dict[str, Any]]],
    scan: str,
    result: LevelResult,
    sums: limits.Sums,
    multiplicity: int,
) -> None:
    """Add the far limit, D_e against the fragments and the picture of the bond."""
    depth = limits.depth_against_fragments(result)
    limit = limits.far_limit(result, sums, (multiplicity - 1) / 2)
    tables["limits"].append(limits.limit_row(scan, result.name, limit, depth[0]))
    tables["fits"].append(limits.depth_row(scan, result.name, depth))
    tables["bond_picture"] += rows.bond_rows(result)


def _no_remedy(_record: Record) -> str:
    return ""


def _by_scan(points: Iterable[Planned]) -> dict[str, dict[str, list[Planned]]]:
    scans: dict[str, dict[str, list[Planned]]] = defaultdict(lambda: defaultdict(list))
    for point in points:
        scans[point.scan][point.level].append(point)
    return scans


def _load(
    name: str, points: list[Planned], campaign: Campaign, store: Store, sources: Sources
) -> LevelResult:
    ordered = sorted(points, key=lambda point: point.number)
    records = [recall_point(store, point, _ARRAYS) for point in ordered]
    for record in records:
        sources.add(record)
    return LevelResult(name, campaign.levels[name], ordered, records)


def _overrides(campaign: Campaign) -> dict[str, Override]:
    given = campaign.diagnostics.thresholds
    return {n: Override(item.value, item.source, item.strong, item.direction) for n, item in given.items()}


def _rule(campaign: Campaign) -> Rule:
    given, limits_given = campaign.diagnostics.weights, campaign.diagnostics.limits
    sources = [item.source for item in given.values()] + ([limits_given.source] if limits_given else [])
    own = (limits_given.borderline, limits_given.multireference) if limits_given else None
    return changed(RULE, {name: item.value for name, item in given.items()}, own, "; ".join(sources))


def _bond(campaign: Campaign, scan: str) -> Bond:
    molecule = campaign.molecules[campaign.scans[scan].molecule]
    first, second = build_path(molecule, campaign.scans[scan]).fragments
    masses = [[molecule.symbols[atom] for atom in fragment] for fragment in (first, second)]
    return Bond(reduced_mass(*masses), len(molecule.symbols) == 2)


def _add(
    tables: dict[str, list[dict[str, Any]]],
    scan: str,
    result: LevelResult,
    multiplicity: int,
    thresholds: Thresholds,
    bond: Bond,
) -> None:
    tables["points"] += rows.point_rows(result)
    tables["diagnostics"] += rows.diagnostic_rows(result, multiplicity, thresholds)
    tables["onsets"] += onset_rows(result, scan, multiplicity, thresholds)
    tables["fits"] += rows.fit_rows(result, scan)
    tables["models"] += rows.model_rows(result, scan, bond.reduced_mass)
    tables["residuals"] += rows.residual_rows(result)
    tables["notes"] += rows.note_rows(result)
    tables["states"] += rows.state_rows(result)
