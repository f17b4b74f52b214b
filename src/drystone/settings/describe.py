"""The config described for people and for editors, made from the typed models.

`option_table` is the table in config/README.md, `json_schema` the content of
workflow/schemas/config.schema.json. After a change of the models, rewrite both, from the root of
the repository: ``python -m drystone.settings.describe --write``.
"""

from __future__ import annotations

import argparse
import json
import sys
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import Any, Literal, get_args, get_origin

from pydantic import BaseModel
from pydantic.fields import FieldInfo

from drystone.settings.formulas import FUNCTIONS
from drystone.settings.model import Settings, Strategy
from drystone.settings.short_forms import accept_short_forms

README = "config/README.md"
SCHEMA = "workflow/schemas/config.schema.json"
REWRITE = "python -m drystone.settings.describe --write"


def option_table() -> str:
    """Every option of the config as a Markdown table: key, values, default, meaning."""
    lines = ["| key | values | default | meaning |", "|---|---|---|---|"]
    for path, field in _options(Settings, ""):
        cells = (f"`{path}`", _values(field), _default(field), str(field.description))
        lines.append("| " + " | ".join(cell.replace("|", "\\|") for cell in cells) + " |")
    return "\n".join(lines) + "\n"


def json_schema() -> dict[str, Any]:
    """JSON Schema (draft 2020-12) of the config, short forms included.

    It knows what may stand where. That names and formulas fit together, only loading the config
    can tell.
    """
    schema = accept_short_forms(Settings.model_json_schema())
    return {"$schema": "https://json-schema.org/draft/2020-12/schema", **schema}


def generated_files() -> dict[str, str]:
    """Text of each generated file by its path from the root of the repository."""
    page = _README.format(
        table=option_table(),
        functions=", ".join(f"`{name}(column)`" for name in FUNCTIONS),
        rewrite=REWRITE,
    )
    return {README: page, SCHEMA: json.dumps(json_schema(), indent=2, ensure_ascii=False) + "\n"}


def main(arguments: Sequence[str] | None = None) -> int:
    """Show the option table, or rewrite the generated files of a repository."""
    parser = argparse.ArgumentParser(prog="python -m drystone.settings.describe")
    parser.add_argument("--write", action="store_true", help=f"rewrite {README} and {SCHEMA}")
    parser.add_argument("root", nargs="?", type=Path, default=Path(), help="of the repository")
    chosen = parser.parse_args(arguments)
    if not chosen.write:
        sys.stdout.write(option_table())
        return 0
    if not (chosen.root / "config").is_dir():
        parser.error(f"{chosen.root} has no folder config; name the root of the repository")
    for name, text in generated_files().items():
        path = chosen.root / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, encoding="utf-8")
    return 0


def _options(model: type[BaseModel], prefix: str) -> Iterator[tuple[str, FieldInfo]]:
    """Fields of ``model`` in order, each followed by the fields of its parts."""
    for name, field in model.model_fields.items():
        path = f"{prefix}{name}"
        yield path, field
        part = _part_in(field.annotation)
        if part is not None:
            yield from _options(part, path + _step(field.annotation))


def _part_in(annotation: Any) -> type[BaseModel] | None:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    found = (_part_in(inner) for inner in get_args(annotation))
    return next((part for part in found if part is not None), None)


def _step(annotation: Any) -> str:
    """How one gets from an option to the options of its parts: by name, in a list, directly."""
    return {dict: ": NAME: ", tuple: ": - "}.get(get_origin(annotation), ": ")


def _values(field: FieldInfo) -> str:
    bounds = [
        f"{word} {getattr(rule, attribute):g}"
        for rule in field.metadata
        for attribute, word in (("gt", "above"), ("ge", "from"), ("lt", "below"), ("le", "to"))
        if getattr(rule, attribute, None) is not None
    ]
    return " ".join([_kind(field.annotation), *bounds])


def _kind(annotation: Any) -> str:
    origin, inner = get_origin(annotation), get_args(annotation)
    if _part_in(annotation) is not None:
        return {dict: "parts by name", tuple: "list"}.get(origin, "a part")
    if origin is Literal:
        return ", ".join(f"`{value}`" for value in inner)
    if origin is dict:
        return f"name: {_kind(inner[1])}"
    if origin is tuple:
        return f"{_kind(inner[0])}; one or a list"
    if inner:  # a type or nothing
        return ", ".join(_kind(option) for option in inner if option is not type(None))
    kinds = {str: "text", bool: "`true`, `false`", float: "number", int: "whole number"}
    return kinds[annotation]


def _default(field: FieldInfo) -> str:
    if field.is_required():
        return "required"
    value = field.get_default(call_default_factory=True)
    if isinstance(value, BaseModel):
        return "as below"
    if isinstance(value, bool):
        return f"`{str(value).lower()}`"
    if value is None or value == {}:
        return "none"
    if isinstance(value, dict):
        return ", ".join(f'`{name}: "{text}"`' for name, text in value.items())
    if isinstance(value, tuple):
        return ", ".join(f"`{_plain(item)}`" for item in value)
    return f"`{_plain(value)}`"


def _plain(value: Any) -> str:
    if isinstance(value, Strategy):
        return value.name
    return f"{value:g}" if isinstance(value, float) else str(value)


_README = """\
# The config

`config.yaml` in this folder belongs to the demo (an invented example) and shows most options with
comments. Only `sheet` and `outcomes` are required; unknown keys are refused, with the nearest known
one. Values are plain: no anchors, no tags, no key twice; `NO`, `on` and dates stay text.

Names of analyses, strategies and models become folders. They hold letters, digits, spaces, dashes,
dots and underscores, and no two may differ by capitals only.

A model is a formula of the sheet's columns: `~ 1`, `~ crop + depth`, `~ crop * depth`,
`~ crop - 1`. Allowed are column names (in backticks when they hold spaces), `1`, `0`, `+`, `- 1`,
`:`, `*`, and {functions}.

A strategy is a name alone, a name with options, or an entry with `name` and `use`, so that one
strategy can stand there twice:

```yaml
strategies:
  - complete cases
  - all cases: {{average_cv: mean of squares}}
  - {{name: all cases pooled, use: all cases, average_over: both arms}}
```

## Options

`NAME` stands for a name of yours, `-` for an item of a list.

{table}
This page and `workflow/schemas/config.schema.json` (for editors that check YAML while one types)
are made from the typed models in `src/drystone/settings/model.py`. After a change there, run
`{rewrite}` in the root of the repository.
"""


if __name__ == "__main__":
    sys.exit(main())
