"""Files that are either old or new, never half written."""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path


@contextmanager
def replacing(path: Path) -> Iterator[Path]:
    """Give a name to write to; it becomes ``path`` in one move when the block ends well.

    Parents are made. After an error ``path`` is as it was and the partial file is gone.
    """
    path.parent.mkdir(parents=True, exist_ok=True)
    partial = path.with_name(f".{path.name}.{os.getpid()}.part")
    try:
        yield partial
        os.replace(partial, path)
    finally:
        partial.unlink(missing_ok=True)


def write_text(path: Path, text: str) -> None:
    """Write ``text`` as UTF-8 to ``path`` in one move."""
    with replacing(path) as partial:
        partial.write_text(text, encoding="utf-8")
