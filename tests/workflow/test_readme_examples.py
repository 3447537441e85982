"""What README.md shows works as it stands there."""

import re
import shlex

import pytest
from scission.cli import COMMANDS, build_parser, main
from scission.execution.layout import PROJECT

README = (PROJECT / "README.md").read_text(encoding="utf-8")
BLOCKS = re.findall(r"^```(\w+)\n(.*?)^```", README, re.MULTILINE | re.DOTALL)


def blocks(language):
    """The fenced blocks in a language."""
    return [text for kind, text in BLOCKS if kind == language]


def command_lines():
    """The lines of all shell blocks that call this program."""
    lines = [line.split("#")[0].strip() for text in blocks("bash") for line in text.splitlines()]
    return [line for line in lines if "scission " in line or line.startswith("scripts/")]


def test_the_campaign_in_the_readme_is_well_formed(tmp_path, capsys):
    """The example passes the check as it is."""
    path = tmp_path / "campaign.yaml"
    path.write_text(blocks("yaml")[0])

    assert main(["check", str(path)]) == 0
    assert "80 points" in capsys.readouterr().out


@pytest.mark.parametrize("line", command_lines())
def test_each_command_in_the_readme_is_understood(line):
    """Programs are there, subcommands and options are known."""
    program, *words = shlex.split(line)
    if program.startswith("scripts/"):
        assert (PROJECT / program).is_file()
        words = ["run", *words]
    args, rest = build_parser().parse_known_args(words)

    assert args.command in COMMANDS
    assert not [word for word in rest if word.startswith("-")]


def test_the_example_that_reads_results_runs(finished, capsys):
    """With the names of the campaign at hand in place of the demo's."""
    text = blocks("python")[0].replace("results/demo", str(finished.layout.folder))
    text = text.replace("scans/n2", "scans/bond").replace('level="cas"', 'level="cc"')
    exec(compile(text, "README.md", "exec"), {})

    assert "hartree" in capsys.readouterr().out
