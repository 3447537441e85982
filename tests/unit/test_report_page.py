"""The page and the summary say what happened, need nothing from elsewhere and trust no text."""

from html.parser import HTMLParser

import pytest
from scission.analysis import analyse
from scission.records import Store
from scission.report import summary_text, write_report
from scission.report.overview import with_error
from synthetic_campaign import TEXT, campaign, fill, points, record


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    return tmp_path_factory.mktemp("campaign")


@pytest.fixture(scope="module")
def analysis(folder):
    store = Store(folder)
    return analyse(fill(store), campaign(folder), store, {"physics_version": 1})


@pytest.fixture(scope="module")
def page(analysis, folder):
    write_report(analysis, folder)
    return (folder / "report.html").read_text()


class Collector(HTMLParser):
    def __init__(self) -> None:
        super().__init__()
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.open: list[str] = []

    def handle_starttag(self, tag, attrs):
        self.tags.append((tag, dict(attrs)))
        if tag not in ("meta", "img"):
            self.open.append(tag)

    def handle_endtag(self, tag):
        assert self.open.pop() == tag


def test_the_page_is_whole_and_needs_no_network(page):
    """Every picture is inside, no script, no link to elsewhere, every tag closed."""
    parser = Collector()
    parser.feed(page)

    assert parser.open == []
    assert not [tag for tag, _ in parser.tags if tag in ("script", "link", "iframe", "object")]
    images = [attrs for tag, attrs in parser.tags if tag == "img"]
    assert len(images) == 2
    assert all(attrs["src"].startswith("data:image/svg+xml;base64,") and attrs["alt"] for attrs in images)


def test_the_page_tells_what_is_needed(page):
    """Counts, flags, fits, failures, active spaces, the caution, versions and the campaign file."""
    for words in (
        "165 points of 2 scans",
        "multireference",
        "omega_e / cm^-1",
        "CCSD did not converge",
        "the job vanished and left nothing",
        "2 electrons in 2 orbitals: the stretched bond",
        "no safety data for reactive or energetic material",
        "records physics version",
        "spacing: graded",
    ):
        assert words in page


def test_text_from_elsewhere_is_not_markup(tmp_path):
    """A message with tags is shown, not obeyed."""
    store = Store(tmp_path)
    planned = points()
    bad = record(planned[0])
    bad.status, bad.reason, bad.message = "failed", "raised", "<script>alert(1)</script>"
    store.write(bad)
    write_report(analyse(planned, campaign(tmp_path), store), tmp_path)
    page = (tmp_path / "report.html").read_text()

    assert "<script>" not in page
    assert "&lt;script&gt;" in page


def test_the_summary_counts_and_names_the_files(analysis, folder):
    """What the terminal shows: points, flags, fits, failures, places."""
    text = summary_text(analysis, folder)

    assert text.startswith("made-up: 165 points, 154 with a result, 11 without")
    assert "multireference" in text
    assert "r_e / angstrom" in text
    assert f"{folder / 'failures.csv'}" in text
    assert max(len(line) for line in text.splitlines()) < 220


def test_a_campaign_without_any_result_is_summed_up(tmp_path):
    """All lost is a result as well."""
    analysis = analyse(points(), campaign(tmp_path, TEXT), Store(tmp_path))
    text = summary_text(analysis)
    write_report(analysis, tmp_path)

    assert "0 with a result, 165 without" in text
    assert "there is no usable point" in text


@pytest.mark.parametrize(
    ("value", "error", "text"),
    [
        (0.91704, 0.0003, "0.9170(3)"),
        (4138.4, 12.0, "4138(12)"),
        (5.9, float("nan"), "5.9"),
        (0.9170, 0.00097, "0.917(1)"),
        (1.0, 1e-14, "1.000000"),
        (float("nan"), 0.1, ""),
        (-0.5, 0.0, "-0.5"),
    ],
)
def test_a_standard_error_stands_in_the_last_digit(value, error, text):
    """Concise notation as metrology uses it (GUM 7.2.2, from memory)."""
    assert with_error(value, error) == text
