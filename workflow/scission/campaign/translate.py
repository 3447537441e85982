"""Pydantic's findings as problems in the words of a campaign file."""

from collections.abc import Mapping
from types import UnionType
from typing import Annotated, Any, Union, get_args, get_origin

from pydantic import BaseModel, ValidationError

from scission.campaign.problems import MISSING, Problem, dotted, one_of

_WANTED = {
    "int_type": "must be a whole number",
    "int_from_float": "must be a whole number",
    "float_type": "must be a number",
    "string_type": "must be a text (put it in quotes if it looks like a number or a truth value)",
    "bool_type": "must be true or false",
    "list_type": "must be a list",
    "tuple_type": "must be a list of two",
    "dict_type": "must be a mapping (key: value)",
    "model_type": "must be a mapping (key: value)",
    "finite_number": "must be a finite number",
    "missing_argument": "is missing",
}


def problems_of(error: ValidationError, model: type[BaseModel], path: tuple[str | int, ...]) -> list[Problem]:
    """Every finding of ``error``, which came from validating ``model`` at ``path``."""
    return [_problem(finding, model, path) for finding in error.errors(include_url=False)]


def _problem(finding: Mapping[str, Any], model: type[BaseModel], path: tuple[str | int, ...]) -> Problem:
    location = (*path, *(part for part in finding["loc"] if not str(part).startswith("<")))
    kind, context = finding["type"], finding.get("ctx", {})
    value = list(finding["input"]) if isinstance(finding["input"], tuple) else finding["input"]
    if kind == "missing" and location and isinstance(location[-1], int):
        return Problem(dotted(location[:-1]), value, "must be a list of two")
    if kind == "missing":
        return Problem(dotted(location), MISSING, "is missing, and it is needed")
    if kind == "extra_forbidden":
        keys = _keys_at(model, finding["loc"][:-1])
        return Problem(dotted(location), location[-1], f"is not a key here {one_of(keys)}")
    return Problem(dotted(location), value, _rule(kind, context, finding["msg"]))


def _rule(kind: str, context: Mapping[str, Any], message: str) -> str:
    bounds = {"greater_than": ("gt", "above"), "greater_than_equal": ("ge", "at least"),
              "less_than_equal": ("le", "at most")}  # fmt: skip
    if kind in bounds:
        key, words = bounds[kind]
        return f"must be {words} {context[key]:g}"
    if kind == "literal_error":
        return f"must be one of {context['expected'].replace(' or ', ', ')}"
    if kind in ("too_short", "string_too_short"):
        return "is empty, and must hold something"
    if kind == "too_long":
        return "must be a list of two"
    return _WANTED.get(kind, message)


def _keys_at(model: type[BaseModel], location: tuple[str | int, ...]) -> list[str]:
    """Keys of the block at ``location``, following annotations down from ``model``."""
    members: list[Any] = [model]
    for part in location:
        if not str(part).startswith("<"):
            members = _step(members, part)
    blocks = [member for member in members if _is_model(member)]
    return [key for block in blocks for key in _fields(block)]


def _step(members: list[Any], part: str | int) -> list[Any]:
    """Types that may stand one step down from one of the types ``members``."""
    for member in members:
        if _is_model(member) and part in _fields(member):
            return _members(_fields(member)[str(part)])
        if get_origin(member) in (dict, list):
            return _members(get_args(member)[-1])
    return []


def _members(annotation: Any) -> list[Any]:
    """The single types inside unions and annotations."""
    if get_origin(annotation) is Annotated:
        return _members(get_args(annotation)[0])
    if get_origin(annotation) in (Union, UnionType):
        return [member for part in get_args(annotation) for member in _members(part)]
    return [annotation]


def _fields(block: type[BaseModel]) -> dict[str, Any]:
    return {field.alias or name: field.annotation for name, field in block.model_fields.items()}


def _is_model(annotation: Any) -> bool:
    return isinstance(annotation, type) and issubclass(annotation, BaseModel)
