"""From the config file to `Settings`; messages name the line and the nearest known key."""

from __future__ import annotations

from pathlib import Path
from typing import Any, get_args

from pydantic import BaseModel, ValidationError

from drystone.settings.model import Settings
from drystone.settings.problems import ConfigProblem, nearest
from drystone.settings.strict_yaml import Document, Location, load_strict, parse_strict

PLAIN = {
    "bool_type": "must be true or false",
    "string_type": "must be text",
    "float_type": "must be a number",
    "dict_type": "must hold names with values under them",
    "tuple_type": "must be a list",
    "model_type": "must hold options under it",
    "model_attributes_type": "must hold options under it",
}


def load_settings(path: Path) -> Settings:
    """Read and check the config at ``path``.

    Raises
    ------
    ConfigProblem
        With file, line, what is wrong and what to do.
    """
    return _settings(load_strict(path), str(path))


def parse_settings(text: str, name: str = "config") -> Settings:
    """Check a config given as ``text``; see `load_settings`."""
    return _settings(parse_strict(text, name), name)


def settings_from(content: dict[str, Any], name: str = "config") -> Settings:
    """Check a config given as a mapping; see `load_settings`."""
    return _settings(Document(content, {}), name)


def _settings(document: Document, name: str) -> Settings:
    if not isinstance(document.content, dict):
        raise ConfigProblem(
            "must hold keys such as 'sheet:' and 'outcomes:'; see config/README.md", name
        )
    try:
        return Settings.model_validate(document.content)
    except ValidationError as error:
        raise _problem(error, document, name) from error


def _problem(error: ValidationError, document: Document, name: str) -> ConfigProblem:
    faults = error.errors(include_url=False)
    first = faults[0]
    location = tuple(first["loc"])
    more = f" (and {len(faults) - 1} more)" if len(faults) > 1 else ""
    where = ": ".join(_step(step) for step in location)
    message = f"{where}: {_sentence(first, location)}" if where else _sentence(first, location)
    return ConfigProblem(message + more, name, document.line(location))


def _step(step: str | int) -> str:
    return f"item {step + 1}" if isinstance(step, int) else step


def _sentence(fault: Any, location: Location) -> str:
    if fault["type"] == "extra_forbidden":
        return f"unknown key; {nearest(str(location[-1]), _known_keys(location[:-1]))}"
    if fault["type"] == "missing":
        return "is required and absent"
    text = PLAIN.get(fault["type"], str(fault["msg"]).removeprefix("Value error, "))
    given = fault.get("input")
    if given is None:
        return f"{text}, and it is empty"
    if fault["type"] == "value_error" or isinstance(given, dict | list | tuple | BaseModel):
        return text
    return f"{text} (it is {given!r})"


def _known_keys(parent: Location) -> list[str]:
    """Keys known at ``parent``; names and list positions on the way down are no fields."""
    model: Any = Settings
    for step in parent:
        field = model.model_fields.get(str(step))
        if field is not None:
            model = _inner_model(field.annotation) or model
    return list(model.model_fields)


def _inner_model(annotation: Any) -> type[BaseModel] | None:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    found = (_inner_model(part) for part in get_args(annotation))
    return next((model for model in found if model is not None), None)
