"""Short forms of the config, written into its JSON Schema.

The models read one value where a list is meant, and a strategy's bare name. Their own schema knows
only the long forms, because the short ones are unfolded before the types are checked.
"""

from __future__ import annotations

from typing import Any

from drystone.words import strategies

Schema = dict[str, Any]

_WORD: Schema = {"type": ["string", "number"]}  # a number is read as text, as in year: 2009


def accept_short_forms(schema: Schema) -> Schema:
    """Return ``schema`` of `Settings` widened by the short forms; the argument stays as it was."""
    parts = {name: _copy(part) for name, part in schema["$defs"].items()}
    analysis = parts["Analysis"]["properties"]
    analysis["outcome"] = _one_or_list(analysis["outcome"], _WORD)
    analysis["levels"] = _one_or_list(analysis["levels"], analysis["levels"]["items"])
    for name in ("where", "where_not"):
        analysis[name]["additionalProperties"] = _one_or_list({}, _WORD)
    top = _copy(schema)
    outcomes = top["properties"]["outcomes"]
    outcomes["additionalProperties"] = {"anyOf": [{"$ref": "#/$defs/Outcome"}, {"type": "null"}]}
    outcomes["minProperties"] = 1
    parts["StrategyOptions"] = _options_only(parts["Strategy"])
    top["properties"]["strategies"]["items"] = _strategy_forms()
    top["properties"]["strategies"]["minItems"] = 1
    return {**top, "$defs": dict(sorted(parts.items()))}


def _copy(schema: Schema) -> Schema:
    """Copy of ``schema`` whose properties can be changed one by one."""
    properties = {name: dict(value) for name, value in schema.get("properties", {}).items()}
    return {**schema, "properties": properties}


def _one_or_list(listed: Schema, item: Schema) -> Schema:
    about = {key: value for key, value in listed.items() if key not in ("type", "items")}
    return {**about, "anyOf": [item, {"type": "array", "items": item}]}


def _options_only(strategy: Schema) -> Schema:
    own = {
        name: value for name, value in strategy["properties"].items() if name not in ("name", "use")
    }
    return {"type": "object", "properties": own, "additionalProperties": False}


def _strategy_forms() -> Schema:
    options = {"anyOf": [{"$ref": "#/$defs/StrategyOptions"}, {"type": "null"}]}
    named = {
        "type": "object",
        "properties": dict.fromkeys(strategies.STRATEGIES, options),
        "additionalProperties": False,
        "minProperties": 1,
        "maxProperties": 1,
    }
    bare = {"enum": list(strategies.STRATEGIES)}
    return {"anyOf": [bare, named, {"$ref": "#/$defs/Strategy"}]}
