"""From the bytes of a campaign file to plain dicts, lists, texts and numbers, or to problems.

Read by the core rules of YAML 1.2: only ``true`` and ``false`` are truth values, so the molecule ``NO``
stays a text, and ``1e-3`` is a number.  Nothing is constructed from tags; aliases are
followed as long as the file stays small when they are written out.
"""

import re
from typing import Any

import yaml

from scission.campaign.problems import MISSING, Problem, dotted

LARGEST_FILE = 256 * 1024
MOST_NODES = 200_000
DEEPEST = 30

_TAG = "tag:yaml.org,2002:"
_INT = re.compile(r"[-+]?[0-9]+\Z")
_FLOAT = re.compile(r"[-+]?(\.[0-9]+|[0-9]+(\.[0-9]*)?)([eE][-+]?[0-9]+)?\Z")
_INFINITE = {".inf": "inf", "+.inf": "inf", "-.inf": "-inf", ".nan": "nan"}
_WORDS: dict[str, Any] = {"": None, "~": None, "null": None, "true": True, "false": False}
_WORDS |= {word.capitalize(): value for word, value in _WORDS.items() if word}
_WORDS |= {word.upper(): value for word, value in _WORDS.items() if word}


class _TextLoader(yaml.SafeLoader):
    """Composes nodes and leaves every plain scalar a text; numbers are recognised here, not there."""

    yaml_implicit_resolvers: dict[str, Any] = {}  # noqa: RUF012  (the base class declares it so)


def parse(raw: bytes) -> tuple[Any, list[Problem]]:
    """Content of the file as plain data, with the problems of its text.

    Duplicate keys, foreign tags and the like are all listed; where the text is no YAML at
    all, or too large, the data is None and the one problem says where.
    """
    if len(raw) > LARGEST_FILE:
        return None, [
            Problem("campaign file", len(raw), f"bytes are too many: at most {LARGEST_FILE} are read")
        ]
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        return None, [_not_utf8(raw, error)]
    try:
        node = yaml.compose(text, Loader=_TextLoader)
        return _Builder().build_document(node)
    except yaml.YAMLError as error:
        return None, [_syntax(text, error)]
    except RecursionError:
        return None, [Problem("campaign file", MISSING, f"is nested deeper than {DEEPEST} levels")]


def _not_utf8(raw: bytes, error: UnicodeDecodeError) -> Problem:
    before = raw[: error.start]
    line = before.count(b"\n") + 1
    column = error.start - (before.rfind(b"\n") + 1) + 1
    rule = "is not UTF-8: save the file in that encoding"
    return Problem(f"line {line}, column {column}", raw[error.start : error.start + 1], rule)


def _syntax(text: str, error: yaml.YAMLError) -> Problem:
    """Line and column of what does not parse, and the parser's own words."""
    if isinstance(error, yaml.MarkedYAMLError) and error.problem_mark is not None:
        mark = error.problem_mark
        lines = text.splitlines()
        shown = lines[mark.line].strip() if mark.line < len(lines) else ""
        words = " ".join(part for part in (error.context, error.problem) if part)
        return Problem(
            f"line {mark.line + 1}, column {mark.column + 1}", shown, f"does not parse as YAML: {words}"
        )
    position = getattr(error, "position", 0)
    line = text[:position].count("\n") + 1
    column = position - (text[:position].rfind("\n") + 1) + 1
    reason = getattr(error, "reason", "unreadable")
    shown = text[position : position + 1]
    return Problem(f"line {line}, column {column}", shown, f"does not parse as YAML: {reason}")


class _Builder:
    """Turns nodes into plain data, collecting problems and counting what aliases multiply."""

    def __init__(self) -> None:
        self.problems: list[Problem] = []
        self.nodes = 0

    def build_document(self, node: yaml.Node | None) -> tuple[Any, list[Problem]]:
        try:
            data = None if node is None else self.build(node, ())
        except _TooLargeError as error:
            return None, [Problem("campaign file", MISSING, str(error))]
        return data, self.problems

    def build(self, node: yaml.Node, path: tuple[str | int, ...]) -> Any:
        self.nodes += 1
        if self.nodes > MOST_NODES:
            raise _TooLargeError(f"holds more than {MOST_NODES} entries once its aliases are written out")
        if len(path) > DEEPEST:
            raise _TooLargeError(f"is nested deeper than {DEEPEST} levels, or an alias refers to itself")
        if isinstance(node, yaml.MappingNode):
            return self.mapping(node, path)
        if isinstance(node, yaml.SequenceNode):
            self.check_tag(node, "seq", path)
            return [self.build(item, (*path, index)) for index, item in enumerate(node.value)]
        return self.scalar(node, path)

    def mapping(self, node: yaml.MappingNode, path: tuple[str | int, ...]) -> dict[str, Any]:
        self.check_tag(node, "map", path)
        data: dict[str, Any] = {}
        for key_node, value_node in node.value:
            key = self.key(key_node, path)
            if key is None:
                continue
            if key in data:
                rule = f"is written twice (again at {_where(key_node)}): keep one"
                self.problems.append(Problem(dotted((*path, key)), key, rule))
                continue
            data[key] = self.build(value_node, (*path, key))
        return data

    def key(self, node: yaml.Node, path: tuple[str | int, ...]) -> str | None:
        value = self.scalar(node, path) if isinstance(node, yaml.ScalarNode) else node.value
        if isinstance(value, str):
            return value
        shown = node.value if isinstance(node, yaml.ScalarNode) else MISSING
        rule = f"({_where(node)}) is not a text, and keys are: put it in quotes"
        self.problems.append(Problem(dotted(path), shown, rule))
        return None

    def scalar(self, node: yaml.Node, path: tuple[str | int, ...]) -> Any:
        assert isinstance(node, yaml.ScalarNode)
        self.check_tag(node, "str", path)
        return node.value if node.style is not None else plain_value(node.value)

    def check_tag(self, node: yaml.Node, kind: str, path: tuple[str | int, ...]) -> None:
        # A lone "!" or a tag in full spelling ends here too: the file has no use for any.
        if node.tag not in (_TAG + kind, None):
            rule = f"({_where(node)}) is a YAML tag, and tags are not allowed: remove it"
            self.problems.append(Problem(dotted(path), node.tag.removeprefix(_TAG), rule))


class _TooLargeError(Exception):
    """The file, written out, is beyond what is read."""


def _where(node: yaml.Node) -> str:
    return f"line {node.start_mark.line + 1}, column {node.start_mark.column + 1}"


def plain_value(text: str) -> Any:
    """A scalar without quotes: null, truth value, integer, number, or else the text itself."""
    if text in _WORDS:
        return _WORDS[text]
    # Python refuses to read integers of thousands of digits; no key of the campaign needs twenty.
    if _INT.match(text) and len(text) < 20:
        return int(text)
    if _FLOAT.match(text):
        return float(text)
    if text.lower() in _INFINITE:
        return float(_INFINITE[text.lower()])
    return text
