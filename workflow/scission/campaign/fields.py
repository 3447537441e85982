"""Small pieces of the campaign's types: how values are read, and what the JSON schema says of them."""

from typing import Any

from pydantic import BaseModel, ConfigDict

NAME_PATTERN = r"^[A-Za-z0-9_][A-Za-z0-9._-]*$"
LONGEST_NAME = 64
# Checked in checks_names, which words it better; here only for editors that read the schema.
NAME: dict[str, Any] = {"pattern": NAME_PATTERN, "maxLength": LONGEST_NAME}
NAMES: dict[str, Any] = {"propertyNames": NAME}


def or_null(schema: dict[str, Any]) -> None:
    """Null stands for none in the file, so editors must not mark it."""
    schema["enum"] = [*schema["enum"], None]
    schema.pop("type", None)


def ref_or_null(schema: dict[str, Any]) -> None:
    """A block whose lines are all commented out is null, and stands for its defaults."""
    schema["anyOf"] = [{"$ref": schema.pop("$ref")}, {"type": "null"}]
    schema["default"] = {}


def map_or_null(schema: dict[str, Any]) -> None:
    """As ``ref_or_null``, for a mapping that is no block of its own."""
    schema["type"] = [schema["type"], "null"]
    schema["default"] = {}


def null_is_empty(value: Any) -> Any:
    """An empty mapping for null, anything else as it is."""
    return {} if value is None else value


def as_tuple(value: Any) -> Any:
    """YAML has lists only; strict types take no list for a tuple."""
    return tuple(value) if isinstance(value, list) else value


def null_is_none(value: Any) -> Any:
    """The word for null: in a campaign file both say that there is no correlation method."""
    return "none" if value is None else value


def kind_of(value: Any) -> str:
    """Tag of a value that may be a mapping, a list or a text; tags are dropped from error paths."""
    kinds = {dict: "<map>", list: "<list>", tuple: "<list>", str: "<text>", type(None): "<null>"}
    return kinds.get(type(value), "<map>" if isinstance(value, BaseModel) else "<other>")


class Strict(BaseModel):
    """No unknown keys, no guessing of types, no infinite numbers."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True, allow_inf_nan=False)
