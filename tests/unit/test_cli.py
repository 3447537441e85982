"""The console command: what it is given, what it says, how it exits."""

from pathlib import Path

import pytest
from scission.cli import COMMANDS, build_parser, main
from scission.cli.campaign_run import has_failures
from scission.cli.common import DEMO, WrongInputError
from scission.cli.run import split_campaign

H2 = """
campaign: h2-check
molecules:
  h2: {charge: 0, multiplicity: 1, atoms: "H 0 0 0\\nH 0 0 0.74"}
levels:
  hf: {reference: RHF, correlation: none, basis: sto-3g}
scans:
  bond:
    molecule: h2
    levels: [hf]
    stretch: {bond: [H1, H2], lengths: {from: 0.5, to: 3.0, points: 6, spacing: even}}
"""


@pytest.fixture
def campaign(tmp_path):
    """A small campaign file."""
    path = tmp_path / "h2.yaml"
    path.write_text(H2)
    return path


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_shows_an_example_in_its_help(name, capsys):
    """--help ends well and names the command in an example."""
    with pytest.raises(SystemExit) as end:
        build_parser().parse_args([name, "--help"])

    assert end.value.code == 0
    assert f"example:\n  scission {name}" in capsys.readouterr().out


@pytest.mark.parametrize(
    ("words", "file", "extra"),
    [
        ([], DEMO, []),
        (["a.yaml"], Path("a.yaml"), []),
        (["a.yaml", "--cores", "1"], Path("a.yaml"), ["--cores", "1"]),
        (["--cores", "1"], DEMO, ["--cores", "1"]),
        (["--cores=1", "a.yaml"], Path("a.yaml"), ["--cores=1"]),
        (["-n", "b.yml"], Path("b.yml"), ["-n"]),
        (["no-suffix"], Path("no-suffix"), []),
    ],
)
def test_the_campaign_is_told_from_the_engines_options(words, file, extra):
    """The first word, or a last one that looks like a campaign file; without one the demo."""
    assert split_campaign(words) == (file, extra)


def test_the_engines_own_option_for_campaigns_is_refused():
    """--configfile would merge two campaigns into one."""
    with pytest.raises(WrongInputError, match="first word"):
        split_campaign(["--configfile", "a.yaml"])


def test_check_counts_points_and_jobs(campaign, capsys):
    """A good file: exit 0, counts by scan and level."""
    assert main(["check", str(campaign)]) == 0
    assert "bond  hf  6 points" in capsys.readouterr().out


@pytest.mark.parametrize("command", ["check", "run"])
def test_a_wrong_campaign_shows_all_its_problems_and_exits_2(campaign, command, capsys):
    """Both mistakes are told at once, plainly; nothing is started."""
    campaign.write_text(H2.replace("sto-3g", "sto-99g").replace("points: 6", "points: 0"))
    results = ["--results", str(campaign.parent / "results")] if command == "run" else []

    assert main([command, str(campaign), *results]) == 2
    said = capsys.readouterr().err
    assert "levels.hf.basis" in said
    assert "scans.bond.stretch.lengths" in said
    assert "Traceback" not in said
    assert not (campaign.parent / "results").exists()


def test_a_campaign_that_is_not_there_exits_2(tmp_path, capsys):
    """The path is in the message."""
    assert main(["run", str(tmp_path / "nope.yaml")]) == 2
    assert "nope.yaml" in capsys.readouterr().err


def test_an_unknown_profile_exits_2_and_names_those_there_are(campaign, capsys):
    """local and slurm are told."""
    arguments = ["run", str(campaign), "--on", "mars", "--results", str(campaign.parent / "r")]

    assert main(arguments) == 2
    assert "local, slurm" in capsys.readouterr().err


def test_status_of_a_campaign_that_never_ran_exits_2(tmp_path, capsys):
    """The folders that were looked in are told."""
    assert main(["status", "nobody", "--results", str(tmp_path)]) == 2
    assert str(tmp_path / "nobody") in capsys.readouterr().err


def test_retry_of_a_list_that_is_not_there_exits_2(tmp_path, capsys):
    """The path is in the message."""
    assert main(["retry", str(tmp_path / "failures.csv")]) == 2
    assert "failures.csv" in capsys.readouterr().err


@pytest.mark.parametrize(("rows", "found"), [("", False), ("a,b\n", True)])
def test_the_failure_list_decides_the_exit_status(tmp_path, rows, found):
    """A list with its header only names no point."""
    path = tmp_path / "failures.csv"
    path.write_text("scan,level\n" + rows)

    assert has_failures(path) is found
