"""Figures show every level, every failure and every threshold, in colour and without."""

import os
import subprocess
import sys

import numpy as np
import pandas as pd
import pytest
from matplotlib.text import Text
from scission.analysis import analyse
from scission.records import Store
from scission.report.canvas import save
from scission.report.diagnostics import shown
from scission.report.energies import LABEL
from scission.report.figure import draw_scan
from scission.report.style import looks
from synthetic_campaign import campaign, fill


@pytest.fixture(scope="module")
def frames(tmp_path_factory):
    folder = tmp_path_factory.mktemp("campaign")
    store = Store(folder)
    return analyse(fill(store), campaign(folder), store).frames


@pytest.fixture(scope="module")
def figure(frames):
    return draw_scan("h-f", frames, "H1-F2 distance")


def texts(figure):
    return [
        text.get_text() for text in figure.findobj(lambda item: hasattr(item, "get_text")) if text.get_text()
    ]


def test_every_axis_has_its_unit(figure):
    """Energy in eV and kcal/mol, length in angstrom, diagnostics by symbol and unit."""
    words = " ".join(texts(figure)).replace("\n", " ")

    assert LABEL in words
    assert "(kcal/mol)" in words
    assert "H1-F2 distance / angstrom (logarithmic scale)" in words
    assert "triplet stability / hartree" in words


def test_a_point_without_a_result_is_a_cross_at_its_length(frames, figure):
    """Each failed point of a level is drawn in that level's colour at the lower edge."""
    colour = looks(["ccsd-t", "uhf", "cas"])["ccsd-t"].colour
    crosses = [
        line for line in figure.axes[0].lines if line.get_marker() == "x" and line.get_color() == colour
    ]
    points = frames["points"]
    failed = points[(points.scan == "h-f") & (points.status != "converged")].coordinate_angstrom

    assert np.allclose(np.concatenate([line.get_xdata() for line in crosses]), failed)


def test_the_fill_of_a_marker_tells_the_flag(frames, figure):
    """Empty markers stand exactly where the verdict is multireference."""
    points = frames["points"]
    here = points[(points.scan == "h-f") & points.energy_hartree.notna()]
    empty = [
        x for line in figure.axes[0].lines if line.get_markerfacecolor() == "white" for x in line.get_xdata()
    ]
    expected = points[(points.scan == "h-f") & (points.flag == "multireference")].coordinate_angstrom

    assert len(here)
    assert sorted(empty) == sorted(expected)


def test_each_diagnostic_is_drawn_against_its_threshold(frames, figure):
    """One panel a diagnostic with a threshold; mirrored occupations appear once."""
    names = shown(frames["diagnostics"][frames["diagnostics"].scan == "h-f"])

    assert {"t1", "d2", "luno", "triplet_stability"} <= set(names)
    assert not {"hono", "uhf_hono", "homo_lumo_gap"} & set(names)
    assert len(figure.axes) == 2 + len(names)
    assert {"> 0.02", "> 0.18", "< 0"} <= set(texts(figure))


def test_no_words_overlap_or_leave_the_picture(figure, monkeypatch):
    """Labels and legends keep apart: no two texts that are drawn share an area."""
    drawn = {}
    draw = Text.draw

    def noted(self, renderer, *rest):
        box = self.get_window_extent(renderer)
        if self.get_visible() and self.get_text() and box.width > 1:
            drawn[self.get_text(), round(box.x0), round(box.y0)] = box
        draw(self, renderer, *rest)

    monkeypatch.setattr(Text, "draw", noted)
    figure.canvas.draw()
    boxes = [(words, box) for (words, _, _), box in drawn.items()]
    clashes = [
        (words, others)
        for i, (words, box) in enumerate(boxes)
        for others, other in boxes[i + 1 :]
        if box.shrunk(0.9, 0.6).overlaps(other.shrunk(0.9, 0.6))
    ]

    assert clashes == []
    for _, box in boxes:
        assert figure.bbox.x0 <= box.x0
        assert box.x1 <= figure.bbox.x1


def test_levels_differ_without_colour():
    """Any two of 18 levels differ in dash or marker."""
    made = looks([f"level-{i}" for i in range(18)])

    assert len({(look.dashes, look.marker) for look in made.values()}) == 18


def test_colours_keep_apart_in_grey_and_from_white():
    """Every line is dark enough on white: relative luminance gives a contrast of 2 at least.

    Contrast as in the WCAG 2 definition, (L1 + 0.05)/(L2 + 0.05), from memory.
    """
    for look in looks([f"level-{i}" for i in range(6)]).values():
        channels = [int(look.colour[i : i + 2], 16) / 255 for i in (1, 3, 5)]
        linear = [c / 12.92 if c <= 0.03928 else ((c + 0.055) / 1.055) ** 2.4 for c in channels]
        luminance = 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]

        assert 1.05 / (luminance + 0.05) > 2.0


@pytest.mark.parametrize(
    "change",
    [
        lambda points: points.head(1),
        lambda points: points.assign(status="failed", relative_energy_ev=np.nan, flag="undetermined"),
        lambda points: points.assign(relative_energy_ev=0.0),
        lambda points: points.assign(relative_energy_ev=points.relative_energy_ev - 300.0),
    ],
    ids=["one point", "no result", "flat", "far below"],
)
def test_odd_scans_still_give_a_picture(frames, tmp_path, change):
    """A single point, no result at all, a flat curve and a runaway one are drawn."""
    points = frames["points"]
    odd = {"points": change(points[points.scan == "h-f"]), "diagnostics": frames["diagnostics"].iloc[:0]}
    svg, png = save(draw_scan("h-f", odd), tmp_path / "h-f")

    assert svg.stat().st_size > 1000
    assert png.read_bytes().startswith(b"\x89PNG")


def test_the_same_tables_give_the_same_files(frames, tmp_path):
    """No date and no chance is in a picture."""
    first = save(draw_scan("n-n", frames), tmp_path / "a")
    second = save(draw_scan("n-n", frames), tmp_path / "b")

    assert [path.read_bytes() for path in first] == [path.read_bytes() for path in second]


def test_a_short_range_keeps_an_even_axis(frames):
    """The logarithmic axis is for scans that reach far out only."""
    figure = draw_scan("n-n", frames, "N1-N2 distance")

    assert figure.axes[-1].get_xscale() == "linear"
    assert "N1-N2 distance / angstrom" in texts(figure)


def test_an_unknown_scan_is_an_error(frames):
    """The message names it."""
    with pytest.raises(ValueError, match="no scan x-y"):
        draw_scan("x-y", {"points": frames["points"], "diagnostics": pd.DataFrame()})


def test_drawing_leaves_nothing_in_the_home_folder(tmp_path):
    """Without a setting matplotlib's cache goes to a folder that is removed at the end."""
    environment = {
        k: v for k, v in os.environ.items() if k not in ("MPLCONFIGDIR", "XDG_CACHE_HOME", "XDG_CONFIG_HOME")
    }
    environment |= {"HOME": str(tmp_path), "TMPDIR": str(tmp_path), "DISPLAY": ""}
    code = "from scission.report.canvas import blank; blank(1, 1).canvas.draw()"
    subprocess.run([sys.executable, "-c", code], env=environment, check=True, timeout=60)

    assert list(tmp_path.iterdir()) == []
