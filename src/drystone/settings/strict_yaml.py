"""YAML as data only: no tags, no anchors, no duplicate keys, no guessed dates or yes/no values.

`NO`, `on` and `2019-05-01` stay text: country codes and site names are not truth values. Every key
keeps its line, so that a message about the config can name it.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import yaml

from drystone.settings.problems import ConfigProblem

LARGEST_FILE = 1_000_000  # bytes; a config is a page or two
DEEPEST = 20

Location = tuple[str | int, ...]


@dataclass(frozen=True)
class Document:
    """Content of a YAML file and the line of every key and list item."""

    content: Any
    lines: dict[Location, int]

    def line(self, location: Location) -> int | None:
        """Line of ``location``, or of the nearest parent that has one."""
        for end in range(len(location), 0, -1):
            if location[:end] in self.lines:
                return self.lines[location[:end]]
        return None


def load_strict(path: Path) -> Document:
    """Read ``path`` as strict YAML.

    Raises
    ------
    ConfigProblem
        When the file is missing, too large, not UTF-8, not YAML, or uses tags, anchors or the
        same key twice; the message names the line.
    """
    return parse_strict(_text_of(path), str(path))


def parse_strict(text: str, name: str = "config") -> Document:
    """Parse ``text``; ``name`` is what messages call it."""
    try:
        _refuse_shortcuts(text, name)
        node = yaml.compose(text, Loader=_Loader)
    except yaml.YAMLError as error:
        raise ConfigProblem(_yaml_message(error), name, _yaml_line(error)) from error
    except RecursionError as error:
        raise ConfigProblem("is nested far too deeply", name) from error
    lines: dict[Location, int] = {}
    content = None if node is None else _build(node, (), lines, name)
    return Document(content, lines)


def _text_of(path: Path) -> str:
    try:
        if path.stat().st_size > LARGEST_FILE:
            raise ConfigProblem("is larger than 1 MB; a config is a page or two", str(path))
        return path.read_text(encoding="utf-8-sig")
    except FileNotFoundError as error:
        raise ConfigProblem(
            "does not exist; `drystone start DIR` writes a review folder with one", str(path)
        ) from error
    except UnicodeDecodeError as error:
        raise ConfigProblem("is not UTF-8 text; save it as UTF-8", str(path)) from error
    except OSError as error:
        raise ConfigProblem(f"cannot be read: {error.strerror}", str(path)) from error


class _Loader(yaml.SafeLoader):
    """Safe loader whose only plain values are null, true, false, numbers and text."""

    yaml_implicit_resolvers: dict[str, list[tuple[str, re.Pattern[str]]]] = {}  # noqa: RUF012


for _tag, _pattern, _first in (
    ("bool", r"^(?:true|True|TRUE|false|False|FALSE)$", "tTfF"),
    ("null", r"^(?:~|null|Null|NULL|)$", ["~", "n", "N", ""]),
    ("int", r"^[-+]?(?:0|[1-9][0-9]*)$", "-+0123456789"),
    ("float", r"^[-+]?(?:\.[0-9]+|[0-9]+\.[0-9]*)(?:[eE][-+]?[0-9]+)?$", "-+.0123456789"),
    ("float", r"^[-+]?[0-9]+[eE][-+]?[0-9]+$", "-+0123456789"),
):
    _Loader.add_implicit_resolver(f"tag:yaml.org,2002:{_tag}", re.compile(_pattern), list(_first))

_PLAIN = {f"tag:yaml.org,2002:{kind}" for kind in ("bool", "null", "int", "float", "str")}


def _refuse_shortcuts(text: str, name: str) -> None:
    for event in yaml.parse(text, Loader=_Loader):
        line = event.start_mark.line + 1 if event.start_mark else None
        if isinstance(event, yaml.AliasEvent) or getattr(event, "anchor", None):
            raise ConfigProblem("uses an anchor or alias (& or *); write it out", name, line)
        tag = getattr(event, "tag", None)
        if tag:
            raise ConfigProblem(
                f"uses the tag '{tag}'; a config holds plain values only", name, line
            )


def _build(node: yaml.Node, at: Location, lines: dict[Location, int], name: str) -> Any:
    lines.setdefault(at, node.start_mark.line + 1)
    if len(at) > DEEPEST:
        raise ConfigProblem("is nested far too deeply", name, node.start_mark.line + 1)
    if isinstance(node, yaml.MappingNode):
        return _build_mapping(node, at, lines, name)
    if isinstance(node, yaml.SequenceNode):
        return [_build(item, (*at, i), lines, name) for i, item in enumerate(node.value)]
    try:
        return _plain(node)
    except ValueError as error:
        raise ConfigProblem("holds a number of far too many digits", name, lines[at]) from error


def _build_mapping(
    node: yaml.MappingNode, at: Location, lines: dict[Location, int], name: str
) -> dict[str, Any]:
    content: dict[str, Any] = {}
    for key_node, value_node in node.value:
        line = key_node.start_mark.line + 1
        if not isinstance(key_node, yaml.ScalarNode):
            raise ConfigProblem("has a key that is not plain text", name, line)
        key = str(key_node.value)
        if key in content:
            first = lines[(*at, key)]
            raise ConfigProblem(
                f"names '{key}' twice (lines {first} and {line}); keep one", name, line
            )
        lines[(*at, key)] = line
        content[key] = _build(value_node, (*at, key), lines, name)
    return content


def _plain(node: yaml.Node) -> Any:
    kind = node.tag.rsplit(":", 1)[-1]
    if kind == "null":
        return None
    if kind == "bool":
        return str(node.value).lower() == "true"
    if kind == "int":
        return int(node.value)
    if kind == "float":
        return float(node.value)
    return str(node.value)


def _yaml_line(error: yaml.YAMLError) -> int | None:
    mark = getattr(error, "problem_mark", None)
    return None if mark is None else int(mark.line) + 1


def _yaml_message(error: yaml.YAMLError) -> str:
    problem = getattr(error, "problem", None) or str(error).splitlines()[0]
    hint = "; indent with spaces" if "'\\t'" in problem else ""
    return f"is not valid YAML: {problem}{hint}"
