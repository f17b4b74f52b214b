"""Moderator formulas, allow-listed before any library sees them.

A formula library evaluates Python inside formulas. So each formula is first parsed here with
Python's own grammar for expressions, and only names, +, :, * and four functions pass.
"""

from __future__ import annotations

import ast
import re

FUNCTIONS = ("C", "center", "log", "scale")
LONGEST = 500
_QUOTED = re.compile(r"`([^`]*)`")


class FormulaProblem(ValueError):
    """A formula that is not allowed or not understood."""


def check_formula(text: str) -> str:
    """Return ``text`` when it is a formula of the allowed kind.

    Raises
    ------
    FormulaProblem
        When it does not begin with ~, or holds anything but column names, 1, 0, +, -, :, *,
        and C(), center(), log(), scale() of a column.
    """
    columns_of(text)
    return text


def columns_of(text: str) -> tuple[str, ...]:
    """Names of the columns that the formula ``text`` uses, in order of appearance.

    Raises
    ------
    FormulaProblem
        See `check_formula`.
    """
    found: list[str] = []
    tree, quoted = _tree(text)
    _walk(tree.body, found, quoted, text)
    return tuple(dict.fromkeys(found))


def is_intercept_only(text: str) -> bool:
    """Whether the formula has no moderator."""
    return not columns_of(text)


def _tree(text: str) -> tuple[ast.Expression, dict[str, str]]:
    body = text.strip()
    if len(body) > LONGEST:
        raise FormulaProblem(f"formula is longer than {LONGEST} characters")
    if not body.startswith("~"):
        raise FormulaProblem(f"formula '{text}' must begin with ~, as in '~ 1' or '~ crop + depth'")
    quoted: dict[str, str] = {}

    def keep(match: re.Match[str]) -> str:
        key = f"quoted_{len(quoted)}_"
        quoted[key] = match.group(1)
        return key

    # the colon of an interaction is no Python operator; @ has no other use here
    plain = _QUOTED.sub(keep, body[1:]).replace("@", " ? ").replace(":", "@")
    try:
        return ast.parse(plain.strip(), mode="eval"), quoted
    except (SyntaxError, ValueError, MemoryError, RecursionError) as error:
        raise FormulaProblem(f"formula '{text}' cannot be read as a formula") from error


def _walk(node: ast.expr, found: list[str], quoted: dict[str, str], text: str) -> None:
    if isinstance(node, ast.BinOp) and isinstance(
        node.op, ast.Add | ast.Mult | ast.MatMult | ast.Sub
    ):
        if isinstance(node.op, ast.Sub) and not _is_one_or_zero(node.right):
            raise FormulaProblem(f"formula '{text}': only '- 1' may be taken away")
        _walk(node.left, found, quoted, text)
        _walk(node.right, found, quoted, text)
    elif isinstance(node, ast.Name):
        found.append(quoted.get(node.id, node.id))
    elif isinstance(node, ast.Call):
        _walk_call(node, found, quoted, text)
    elif not _is_one_or_zero(node):
        raise FormulaProblem(
            f"formula '{text}' holds something that is not allowed: use column names, 1, 0, +, :, "
            f"* and {', '.join(f'{name}()' for name in FUNCTIONS)}"
        )


def _walk_call(node: ast.Call, found: list[str], quoted: dict[str, str], text: str) -> None:
    name = node.func.id if isinstance(node.func, ast.Name) else "this"
    if name not in FUNCTIONS or node.keywords or len(node.args) != 1:
        raise FormulaProblem(
            f"formula '{text}': {name}() is not allowed; "
            f"there are {', '.join(f'{known}(column)' for known in FUNCTIONS)}"
        )
    if not isinstance(node.args[0], ast.Name):
        raise FormulaProblem(f"formula '{text}': {name}() takes the name of one column")
    _walk(node.args[0], found, quoted, text)


def _is_one_or_zero(node: ast.expr) -> bool:
    return isinstance(node, ast.Constant) and type(node.value) is int and node.value in (0, 1)
