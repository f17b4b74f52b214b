"""JSON records of the cache."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

from drystone.tables.atomic import write_text


def write_json(path: Path, content: Any) -> None:
    """Write ``content`` as readable JSON in one move."""
    write_text(path, json.dumps(content, indent=1, sort_keys=True, ensure_ascii=False) + "\n")


def read_json(path: Path) -> Any:
    """Content of a JSON file; None when it is absent or damaged."""
    try:
        return json.loads(path.read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return None
