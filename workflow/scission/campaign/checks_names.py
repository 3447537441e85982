"""Names: safe as parts of paths, distinct, and referring to something."""

import re
from collections.abc import Collection

from scission.campaign.conclusions import Diagnostics, Threshold
from scission.campaign.fields import LONGEST_NAME, NAME_PATTERN
from scission.campaign.parts import Parts
from scission.campaign.problems import MISSING, Problem, one_of
from scission.diagnostics import DIAGNOSTICS
from scission.thresholds import THRESHOLDS, is_over
from scission.thresholds.rule import RULE

_SAFE = re.compile(NAME_PATTERN)
# Names that Windows keeps for devices, whatever follows the first dot: results are copied there too.
_RESERVED = {"con", "prn", "aux", "nul"} | {f"{port}{n}" for port in ("com", "lpt") for n in range(10)}


def check_names(parts: Parts) -> list[Problem]:
    """Names of the campaign, molecules, levels and scans."""
    name = parts.data.get("campaign")
    problems = _unsafe(name, "campaign") if isinstance(name, str) else []
    for section in ("molecules", "levels", "scans"):
        seen: dict[str, str] = {}
        for name in parts.declared(section):
            path = f"{section}.{name}"
            problems += _unsafe(name, path)
            if name.lower() in seen:
                rule = (
                    f"differs from {seen[name.lower()]!r} only in case: some file systems take them for one"
                )
                problems.append(Problem(path, name, rule))
            seen[name.lower()] = name
    return problems


def _unsafe(name: str, path: str) -> list[Problem]:
    if not _SAFE.fullmatch(name):
        rule = "is not a safe name: letters, digits, '.', '_' and '-', not beginning with '.' or '-'"
        return [Problem(path, name, rule)]
    if len(name) > LONGEST_NAME:
        return [Problem(path, name, f"is longer than {LONGEST_NAME} characters")]
    if name.endswith(".") or name.lower().split(".")[0] in _RESERVED:
        return [Problem(path, name, "cannot be the name of a folder on every system: choose another")]
    return []


def check_references(parts: Parts) -> list[Problem]:
    """Molecules and levels that scans and ``reference_level`` name are there, and named once.

    Where the whole section is missing that is the problem, and not each name.
    """
    problems = []
    molecules, levels = parts.declared("molecules"), parts.declared("levels")
    for name, scan in parts.scans.items():
        path = f"scans.{name}"
        if molecules and scan.molecule not in molecules:
            rule = f"is not a molecule of this campaign {one_of(molecules)}"
            problems.append(Problem(f"{path}.molecule", scan.molecule, rule))
        for place, level in enumerate(scan.levels):
            if levels and level not in levels:
                rule = f"is not a level of this campaign {one_of(levels)}"
                problems.append(Problem(f"{path}.levels[{place}]", level, rule))
            elif level in scan.levels[:place]:
                problems.append(Problem(f"{path}.levels[{place}]", level, "is listed twice"))
    reference = parts.data.get("reference_level")
    if isinstance(reference, str) and levels and reference not in levels:
        rule = f"is not a level of this campaign {one_of(levels)}"
        problems.append(Problem("reference_level", reference, rule))
    return problems


def check_analysis(parts: Parts, diagnostic_names: Collection[str]) -> list[Problem]:
    """Diagnostics by name, sources of thresholds, repeated entries."""
    problems = []
    diagnostics = parts.diagnostics
    for name, threshold in diagnostics.thresholds.items():
        path = f"diagnostics.thresholds.{name}"
        problems += _unknown_diagnostic(name, path, diagnostic_names)
        problems += _direction(name, threshold, path)
        if not threshold.source.strip():
            rule = "is no source: say where the value comes from"
            problems.append(Problem(f"{path}.source", threshold.source, rule))
    problems += _weights(diagnostics)
    for place, name in enumerate(diagnostics.include):
        problems += _unknown_diagnostic(name, f"diagnostics.include[{place}]", diagnostic_names)
    problems += _repeated(diagnostics.include, "diagnostics.include")
    return problems + _repeated(list(parts.fit.models), "fit.models")


def _weights(diagnostics: Diagnostics) -> list[Problem]:
    """Weights of diagnostics that the rule knows, limits that rise, each with a source."""
    problems = []
    for name, weight in diagnostics.weights.items():
        path = f"diagnostics.weights.{name}"
        if name not in RULE.weights:
            rule = f"is not a diagnostic that the rule of the flags weighs {one_of(RULE.weights)}"
            problems.append(Problem(path, name, rule))
        if not weight.source.strip():
            problems.append(
                Problem(f"{path}.source", weight.source, "is no source: say where the weight comes from")
            )
    limits = diagnostics.limits
    if limits is not None and limits.borderline >= limits.multireference:
        rule = f"must lie below multireference ({limits.multireference:g})"
        problems.append(Problem("diagnostics.limits.borderline", limits.borderline, rule))
    return problems


def _direction(name: str, threshold: Threshold, path: str) -> list[Problem]:
    """A diagnostic without a threshold needs the side that is over, the others must not turn theirs."""
    if name not in DIAGNOSTICS:
        return []
    own = THRESHOLDS[name][0].direction if name in THRESHOLDS else None
    if own is None and threshold.direction is None:
        return [
            Problem(f"{path}.direction", MISSING, "is missing: the diagnostic has no threshold of its own")
        ]
    if own is not None and threshold.direction not in (None, own):
        return [Problem(f"{path}.direction", threshold.direction, f"must be {own}, as the diagnostic has it")]
    strong = threshold.strong
    side = own or threshold.direction
    if strong is not None and side is not None and not is_over(strong, threshold.value, side):
        return [Problem(f"{path}.strong", strong, f"must lie {side} value ({threshold.value:g})")]
    return []


def _unknown_diagnostic(name: str, path: str, known: Collection[str]) -> list[Problem]:
    if name in known:
        return []
    return [Problem(path, name, f"is not a diagnostic {one_of(known)}")]


def _repeated(entries: list[str], path: str) -> list[Problem]:
    return [
        Problem(f"{path}[{place}]", entry, "is listed twice")
        for place, entry in enumerate(entries)
        if entry in entries[:place]
    ]
