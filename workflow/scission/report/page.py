"""report.html: one page with everything in it, no network and no script needed."""

from __future__ import annotations

import base64
from html import escape
from pathlib import Path

import pandas as pd

from scission.analysis import Analysis
from scission.records.atomic import write_whole
from scission.report.canvas import save
from scission.report.figure import draw_scan
from scission.report.judgement import SCORECARD, distrust, draw_scorecard, onset_table, score_table
from scission.report.overview import CAUTION, best_constants, counts, failure_counts, far_limits

_STYLE = """
body { font: 15px/1.5 "DejaVu Sans", Verdana, sans-serif; color: #222; background: #fff;
       max-width: 84rem; margin: 2rem auto; padding: 0 1rem; }
p, figcaption { max-width: 64rem; }
h1 { font-size: 1.6rem; margin-bottom: 0.2rem; } h2 { font-size: 1.15rem; margin-top: 2.2rem; }
table { border-collapse: collapse; font-size: 0.85rem; margin: 0.6rem 0; }
th, td { padding: 0.2rem 0.7rem; text-align: left; vertical-align: top; border-bottom: 1px solid #ddd; }
th { border-bottom: 1.5px solid #222; }
td.words { min-width: 17rem; }
td.number { text-align: right; font-variant-numeric: tabular-nums; white-space: nowrap; }
.wide { overflow-x: auto; } figure { margin: 1rem 0 2rem; } img { max-width: 100%; height: auto; }
figcaption, .small { font-size: 0.85rem; color: #444; }
.caution { border-left: 4px solid #222; padding: 0.3rem 0.8rem; }
pre { background: #f4f4f4; padding: 0.8rem; overflow-x: auto; font-size: 0.8rem; }
@media print { figure, table { break-inside: avoid; } }
"""

_CAPTION = (
    "Above, energies, each level from its own minimum. A filled marker stands for a point whose verdict "
    "is single-reference, a grey one for borderline, an empty one for multireference; a cross at the "
    "lower edge for a point without a result. The strip under them shows the flag of each level along "
    "the scan (full, grey, empty) and, where there is a reference level, the interval within which the "
    "level keeps to it. Below, the diagnostics that decide and the weightiest others that are over, "
    "each with its threshold (dashed), the side beyond it (shaded) and the length where it crosses; all "
    "others are in tables/diagnostics.csv and onsets.csv."
)

_DISTRUST = (
    "Trusted: about the minimum, as long as the error against the reference level stays within the "
    "tolerance; empty without a reference level. Flags speak of the geometry, not of the level: CASSCF "
    "and full CI cope with a multireference point. All stretches and reasons: tables/verdicts.csv; "
    "errors: points.csv, comparison.csv."
)
_ONSETS = (
    "First crossing of the threshold, angstrom. Brackets, further crossings and diagnostics that never "
    "cross: tables/onsets.csv."
)
_SCORES = (
    "Over all points from the minimum outward: hits are points over the threshold where the level errs "
    "by more than the tolerance. Skill is the share of the errors found less the share of false alarms "
    "(Youden 1950). Late by: onset less the end of the trusted interval, negative warns in time."
)


def write_report(analysis: Analysis, folder: Path) -> list[Path]:
    """Write ``figures/<scan>.svg`` and ``.png`` and ``report.html``; each file appears whole or not at all.

    Raises:
        OSError: the folder cannot be written.
    """
    written: list[Path] = []
    pictures = {}
    for scan, coordinate in analysis.coordinates.items():
        svg, png = save(draw_scan(scan, analysis.frames, coordinate), folder / "figures" / scan)
        pictures[scan] = svg
        written += [svg, png]
    scorecard = analysis.frames["scorecard"]
    if scorecard.late_angstrom.notna().any():
        pictures[SCORECARD], png = save(draw_scorecard(scorecard), folder / "figures" / f"_{SCORECARD}")
        written += [pictures[SCORECARD], png]
    page = folder / "report.html"
    write_whole(page, page_html(analysis, pictures).encode("utf-8"))
    return [*written, page]


def page_html(analysis: Analysis, pictures: dict[str, Path]) -> str:
    """The page as text; ``pictures`` maps scans to SVG files, which are put into the page."""
    name, frames = escape(analysis.campaign.name), analysis.frames
    parts = [
        f"<h1>{name}</h1>",
        _opening(analysis),
        f'<p class="caution">{escape(CAUTION)}</p>',
        "<h2>Points and flags</h2>",
        html_table(counts(frames["points"], frames["limits"])),
        "<h2>From where on to distrust which level</h2>",
        html_table(distrust(frames)) + f'<p class="small">{_DISTRUST}</p>',
        "<h2>Scans</h2>",
        *(_figure(scan, path) for scan, path in pictures.items() if scan != SCORECARD),
        "<h2>Onsets of the diagnostics</h2>",
        html_table(onset_table(frames["onsets"])) + f'<p class="small">{_ONSETS}</p>',
        *_scorecard(frames["scorecard"], pictures.get(SCORECARD)),
        "<h2>Fits</h2>",
        _fits(frames),
        "<h2>Far limits</h2>",
        _limits(frames["limits"]),
        "<h2>Points without a result</h2>",
        _failures(frames["failures"], analysis.campaign.name),
        "<h2>Active spaces and other remarks</h2>",
        _notes(frames["notes"]),
        "<h2>Where the numbers come from</h2>",
        _provenance(analysis),
    ]
    head = f'<meta charset="utf-8"><title>{name}</title><style>{_STYLE}</style>'
    return (
        f'<!DOCTYPE html>\n<html lang="en"><head>{head}</head>\n<body>\n'
        + "\n".join(parts)
        + "\n</body></html>\n"
    )


def _scorecard(scorecard: pd.DataFrame, picture: Path | None) -> list[str]:
    """How well the diagnostics foretold the errors; nothing without a reference level."""
    if scorecard.empty:
        return []
    image = "" if picture is None else _image(picture, "How early or late each diagnostic warned")
    table = html_table(score_table(scorecard)) + f'<p class="small">{_SCORES}</p>'
    return ["<h2>Scorecard of the diagnostics</h2>", image, table]


def html_table(table: pd.DataFrame) -> str:
    """A table as HTML; every cell is escaped."""
    if table.empty:
        return "<p>None.</p>"
    head = "".join(f"<th>{escape(str(name))}</th>" for name in table)
    body = ["".join(_cell(value) for value in row) for row in table.itertuples(index=False)]
    rows = "".join(f"<tr>{row}</tr>\n" for row in body)
    return f'<div class="wide"><table><thead><tr>{head}</tr></thead><tbody>\n{rows}</tbody></table></div>'


def _cell(value: object) -> str:
    if isinstance(value, str):
        return f'<td class="words">{escape(value)}</td>' if len(value) > 40 else f"<td>{escape(value)}</td>"
    text = f"{value:.4g}" if isinstance(value, float) else str(value)
    return f'<td class="number">{escape(text)}</td>'


def _opening(analysis: Analysis) -> str:
    points = analysis.frames["points"]
    words = (
        f"{len(points)} points of {points.scan.nunique()} scans at {points.level.nunique()} levels: "
        f"{len(points) - analysis.n_failures} with a result, {analysis.n_failures} without."
    )
    if analysis.mixed:
        words += f" Caution: the records differ in {', '.join(analysis.mixed)}."
    return f"<p>{escape(words)}</p>"


def _image(path: Path, alt: str) -> str:
    data = base64.b64encode(path.read_bytes()).decode("ascii")
    return f'<img alt="{escape(alt)}" src="data:image/svg+xml;base64,{data}">'


def _figure(scan: str, path: Path) -> str:
    image = _image(path, f"Energies and diagnostics of the scan {scan}; the numbers are in tables/points.csv")
    return f"<figure>{image}<figcaption>{escape(scan)}. {_CAPTION}</figcaption></figure>"


def _fits(frames: dict[str, pd.DataFrame]) -> str:
    words = (
        "Standard errors of the fit stand in brackets, in units of the last digit; they say how well "
        "the points determine the model, not how good the level is. D_e is from the preferred model of the "
        "whole well, all else from the polynomial about the minimum. All models, residuals and left-out "
        "points: tables/fits.csv, models.csv, residuals.csv."
    )
    return html_table(best_constants(frames)) + f'<p class="small">{words}</p>'


def _limits(limits: pd.DataFrame) -> str:
    words = (
        "The fragments are computed by themselves at each level, in the geometry of the scan, in the spins "
        "that couple to the molecule's. Ionic sums, and fragments without an energy: tables/limits.csv."
    )
    return html_table(far_limits(limits)) + f'<p class="small">{words}</p>'


def _failures(failures: pd.DataFrame, campaign: str) -> str:
    if failures.empty:
        return "<p>None: every point has a result.</p>"
    words = "Each point is in failures.csv; delete rows that need no second try and compute the others with"
    command = escape(f"scission retry results/{campaign}/failures.csv")
    return html_table(failure_counts(failures)) + f'<p class="small">{words} <code>{command}</code>.</p>'


def _notes(notes: pd.DataFrame) -> str:
    """Remarks that are the same on many points; those that differ from point to point are in the table."""
    if notes.empty:
        return "<p>None.</p>"
    often = notes.groupby(["scan", "level", "subject"])["note"].transform("size") <= 3
    hidden = int((~often).sum())
    more = f'<p class="small">{hidden} further remarks: tables/notes.csv.</p>' if hidden else ""
    return html_table(notes[often]) + more


def _provenance(analysis: Analysis) -> str:
    facts = {name: value for name, value in analysis.provenance.items() if name != "campaign_file"}
    table = pd.DataFrame([(name.replace("_", " "), str(value)) for name, value in facts.items()])
    rows = "".join(
        f"<tr>{''.join(_cell(value) for value in row)}</tr>\n" for row in table.itertuples(index=False)
    )
    text = escape(str(analysis.provenance["campaign_file"]))
    given = f'<p class="small">The campaign file as given:</p><pre>{text}</pre>'
    return f"<table><tbody>\n{rows}</tbody></table>\n{given}"
