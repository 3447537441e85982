"""What is wrong with a campaign file: path, value and rule of every problem."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

LONGEST_VALUE = 80


class _Missing:
    """Stands for a key that is not in the file; there is no value to show."""

    def __repr__(self) -> str:
        return "(missing)"


MISSING = _Missing()


@dataclass(frozen=True)
class Problem:
    """One problem: where (``path``), what stands there (``value``), and what must hold (``rule``).

    The rule goes on from the value, so that ``str(problem)`` is one sentence.
    """

    path: str
    value: object
    rule: str

    def __str__(self) -> str:
        shown = "" if self.value is MISSING else f"{_short(self.value)} "
        return f"{self.path}: {shown}{self.rule}"


class CampaignError(ValueError):
    """The campaign file is wrong; ``problems`` lists everything that was found, in order of the file."""

    def __init__(self, problems: Iterable[Problem]) -> None:
        self.problems = list(problems)
        super().__init__("\n".join(str(problem) for problem in self.problems))


def dotted(parts: Sequence[str | int]) -> str:
    """``("scans", "a", "levels", 1)`` as ``scans.a.levels[1]``; the empty path is the whole campaign."""
    text = ""
    for part in parts:
        text += f"[{part}]" if isinstance(part, int) else f".{part}" if text else part
    return text or "campaign file"


def one_of(choices: Iterable[str]) -> str:
    """Choices in brackets, ``(cc, cas)``, or ``(there are none)``."""
    return f"({', '.join(choices) or 'there are none'})"


def _short(value: object) -> str:
    text = repr(value)
    return text if len(text) <= LONGEST_VALUE else text[: LONGEST_VALUE - 3] + "..."
