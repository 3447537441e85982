"""The strip that shows from where on each level is to be distrusted, and why."""

import pandas as pd
from scission.report.canvas import blank
from scission.report.style import looks
from scission.report.trust import draw_trust, headline, trust_handles

VERDICTS = pd.DataFrame(
    {
        "level": ["cc", "cc", "cc"],
        "flag": ["single-reference", "borderline", "multireference"],
        "from_angstrom": [0.8, 1.2, 1.5],
        "to_angstrom": [1.1, 1.4, 3.0],
        "reasons": [
            "mean grade 0.10 of 2",
            "LUNO 0.12 > 0.10 (level cas); mean grade 0.90 of 2",
            "D2 0.4 > 0.18",
        ],
    }
)
COMPARISON = pd.DataFrame(
    {
        "level": ["cc"] * 3,
        "reference_level": ["fci"] * 3,
        "quantity": ["tolerance", "trusted_from", "trusted_to"],
        "value": [1.0, 0.8, 1.62],
        "what": ["", "holds from the first point", "beyond it the level lies too far below"],
    }
)


def test_the_headline_says_from_where_and_why():
    """Where the flag changes outward of the well, with the first reasons, one line a change."""
    borderline, multireference = headline(VERDICTS).splitlines()

    assert borderline.startswith("borderline from 1.20 angstrom on: LUNO 0.12 > 0.10")
    assert multireference == "multireference from 1.50 angstrom on: D2 0.4 > 0.18"


def test_a_scan_without_doubt_says_so():
    """One flag everywhere is one short line."""
    assert headline(VERDICTS.head(1)) == "single-reference at every point"


def test_bars_are_the_flags_and_the_line_the_trusted_interval():
    """Three stretches, three bars that meet half way; the line ends where the level leaves the tolerance."""
    axes = blank(6, 1).add_axes([0.2, 0.2, 0.6, 0.6])
    draw_trust(axes, VERDICTS, COMPARISON, looks(["cc"]))

    assert [round(bar.get_x(), 3) for bar in axes.patches] == [0.8, 1.15, 1.45]
    assert max(line.get_xdata()[1] for line in axes.lines) == 1.62
    assert "to 1.62" in {text.get_text() for text in axes.texts}
    assert trust_handles(COMPARISON)[0].get_label() == "trusted (1 kcal/mol)"


def test_without_a_reference_level_there_are_only_flags():
    """No comparison, no line and no legend for one."""
    axes = blank(6, 1).add_axes([0.2, 0.2, 0.6, 0.6])
    draw_trust(axes, VERDICTS, COMPARISON.head(0), looks(["cc"]))

    assert not axes.lines
    assert trust_handles(COMPARISON.head(0)) == []
