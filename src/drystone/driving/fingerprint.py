"""Fingerprints of code: what a step's result depends on besides its data and its options.

The fingerprint of a module is the digest of its syntax tree without docstrings, so a comment, a
docstring or a reformatting changes nothing. A step depends on its stage module, on every module of
this package that it imports (also lazily, inside functions), on their data files, and on the
versions of the libraries that these modules name.
"""

from __future__ import annotations

import ast
import hashlib
import json
import sys
from collections.abc import Iterable, Iterator
from functools import cache
from importlib import metadata
from pathlib import Path

PACKAGE = "drystone"
ROOT = Path(__file__).resolve().parents[1]
DATA_SUFFIXES = {".html", ".css", ".svg", ".json"}


class CodeIndex:
    """Fingerprints of modules, remembered by the hash of their source text.

    Parameters
    ----------
    remembered : what `memory` returned in an earlier process; parsing syntax trees takes longer
        than all the rest of a run with nothing to do
    """

    def __init__(self, remembered: dict[str, list] | None = None) -> None:
        self._known = dict(remembered or {})
        self._used: dict[str, list] = {}
        self._modules: dict[str, tuple[str, tuple[str, ...], tuple[str, ...]]] = {}

    def memory(self) -> dict[str, list]:
        """What to remember for the next process."""
        return self._used

    def closure(self, modules: Iterable[str]) -> dict[str, str]:
        """Fingerprint of every module in ``modules`` and of all that they import here."""
        waiting, found = list(modules), {}
        while waiting:
            name = waiting.pop()
            if name in found:
                continue
            digest, inner, _ = self._module(name)
            found[name] = digest
            waiting.extend(inner)
        return dict(sorted(found.items()))

    def libraries(self, modules: Iterable[str]) -> dict[str, str]:
        """Versions of the libraries named in the closure of ``modules``."""
        names = {outer for name in self.closure(modules) for outer in self._module(name)[2]}
        versions = {name: _version(name) for name in sorted(names)}
        return {name: version for name, version in versions.items() if version}

    def _module(self, name: str) -> tuple[str, tuple[str, ...], tuple[str, ...]]:
        if name not in self._modules:
            path = module_path(name)
            source = path.read_bytes()
            extra = _data_digest(path)
            key = hashlib.sha256(name.encode() + source + extra.encode()).hexdigest()
            entry = self._known.get(key) or _analyse(name, source, extra)
            self._used[key] = entry
            self._modules[name] = (entry[0], tuple(entry[1]), tuple(entry[2]))
        return self._modules[name]


@cache
def module_path(name: str) -> Path:
    """Source file of a module of this package.

    Raises
    ------
    LookupError
        When there is no such module.
    """
    base = ROOT.joinpath(*name.split(".")[1:])
    for candidate in (base / "__init__.py", base.with_suffix(".py")):
        if candidate.is_file():
            return candidate
    raise LookupError(f"no module {name}")


def syntax_digest(source: bytes) -> str:
    """Digest of the syntax tree without docstrings."""
    tree = ast.parse(source)
    for node in ast.walk(tree):
        if isinstance(node, ast.Module | ast.ClassDef | ast.FunctionDef | ast.AsyncFunctionDef):
            _drop_docstring(node)
    return hashlib.sha256(ast.dump(tree).encode()).hexdigest()[:16]


def _analyse(name: str, source: bytes, extra: str) -> list:
    inner, outer = _imports(ast.parse(source), name)
    return [syntax_digest(source) + extra, sorted(inner), sorted(outer)]


def _drop_docstring(
    node: ast.Module | ast.ClassDef | ast.FunctionDef | ast.AsyncFunctionDef,
) -> None:
    first = node.body[0] if node.body else None
    text = first.value if isinstance(first, ast.Expr) else None
    if isinstance(text, ast.Constant) and isinstance(text.value, str):
        node.body = node.body[1:] or [ast.Pass()]


def _imports(tree: ast.Module, name: str) -> tuple[set[str], set[str]]:
    inner: set[str] = set()
    outer: set[str] = set()
    for node in _walk_running_code(tree):
        if isinstance(node, ast.Import):
            targets = [alias.name for alias in node.names]
        elif isinstance(node, ast.ImportFrom) and node.module and node.level == 0:
            targets = [node.module, *(f"{node.module}.{alias.name}" for alias in node.names)]
        else:
            continue
        for target in targets:
            _sort_import(target, inner, outer)
    return inner - {name}, outer


def _walk_running_code(tree: ast.AST) -> Iterator[ast.AST]:
    """All nodes but those under ``if TYPE_CHECKING``, which never run."""
    for node in ast.iter_child_nodes(tree):
        if isinstance(node, ast.If) and getattr(node.test, "id", "") == "TYPE_CHECKING":
            continue
        yield node
        yield from _walk_running_code(node)


def _sort_import(target: str, inner: set[str], outer: set[str]) -> None:
    top = target.split(".")[0]
    if top == PACKAGE:
        try:
            module_path(target)
        except LookupError:
            return
        inner.add(target)
    elif top not in sys.stdlib_module_names and top != "__future__":
        outer.add(top)


def _data_digest(path: Path) -> str:
    """Digest of the templates that lie in the folder of a package's __init__ file."""
    if path.name != "__init__.py":
        return ""
    files = sorted(
        item
        for item in path.parent.rglob("*")
        if item.suffix in DATA_SUFFIXES and item.is_file() and not _own_package(item, path.parent)
    )
    if not files:
        return ""
    return hashlib.sha256(b"\0".join(item.read_bytes() for item in files)).hexdigest()[:16]


def _own_package(item: Path, package: Path) -> bool:
    """Whether a nearer package than ``package`` holds ``item``."""
    folder = item.parent
    while folder != package:
        if (folder / "__init__.py").exists():
            return True
        folder = folder.parent
    return False


@cache
def _version(top: str) -> str | None:
    try:
        return metadata.version(_DISTRIBUTIONS.get(top, top))
    except metadata.PackageNotFoundError:
        return None


_DISTRIBUTIONS = {
    "yaml": "PyYAML",
    "python_calamine": "python-calamine",
    "vl_convert": "vl-convert-python",
    "jinja2": "Jinja2",
}


def digest(content: object) -> str:
    """Short digest of anything that JSON can hold."""
    text = json.dumps(content, sort_keys=True, ensure_ascii=True, separators=(",", ":"))
    return hashlib.sha256(text.encode()).hexdigest()[:20]
