"""Pydantic's findings as problems in the words of a campaign file."""

from collections.abc import Mapping
from typing import Any

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
    kind, value, context = finding["type"], finding["input"], finding.get("ctx", {})
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
        return f"holds more than {context['max_length']} entries"
    return _WANTED.get(kind, message)


def _keys_at(model: type[BaseModel], location: tuple[str | int, ...]) -> list[str]:
    """Keys of the block at ``location``, following annotations down from ``model``."""
    block: Any = model
    for part in location:
        block = _step(block, part)
    return [field.alias or name for name, field in block.model_fields.items()]


def _step(block: Any, part: str | int) -> Any:
    """The type one step down: a field's, or the model among a container's or a union's types."""
    if isinstance(block, type) and issubclass(block, BaseModel):
        fields = {field.alias or name: field.annotation for name, field in block.model_fields.items()}
        annotation = fields[str(part)]
        return annotation if _is_model(annotation) else _inner_model(annotation)
    return block if _is_model(block) else _inner_model(block)


def _is_model(annotation: Any) -> bool:
    return isinstance(annotation, type) and issubclass(annotation, BaseModel)


def _inner_model(annotation: Any) -> Any:
    """The first model type inside ``dict[str, X]``, ``X | None`` or an annotated union."""
    for argument in getattr(annotation, "__args__", ()):
        found = argument if _is_model(argument) else _inner_model(argument)
        if found is not None:
            return found
    return None
