"""Formulas of a workbook: what they say, and whether their last value was stored."""

from __future__ import annotations

import re
import zipfile
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any
from xml.parsers import expat

from openpyxl.formula.tokenizer import TokenizerError
from openpyxl.formula.translate import Translator, TranslatorError
from openpyxl.utils.cell import coordinate_to_tuple

Place = tuple[int, int]  # row and column, from 1
_FORMULA = re.compile(rb"<(?:\w+:)?f[\s/>]")
_SHARED, _ARRAY, _TABLE = "shared", "array", "dataTable"


@dataclass(slots=True)
class Formula:
    """One formula.

    Parameters
    ----------
    text : as typed, with its equals sign; blank when it repeats the formula of ``group``
    unsaved : True when no value was ever stored
    several : True when one formula fills several cells at once
    group : name of the group of cells that share one formula
    """

    text: str
    unsaved: bool
    several: bool = False
    group: str = ""


def scan_formulas(archive: zipfile.ZipFile, parts: Mapping[str, str]) -> dict[str, FormulaSheet]:
    """Formulas by sheet; ``parts`` maps the parts of the workbook to sheet names."""
    found = {}
    for path, name in parts.items():
        content = archive.read(path)
        if _FORMULA.search(content):
            found[name] = FormulaSheet()
            found[name].read(content)
    return {name: sheet for name, sheet in found.items() if sheet.cells}


class FormulaSheet:
    """Formulas of one sheet, by place."""

    def __init__(self) -> None:
        self.cells: dict[Place, Formula] = {}
        self._origins: dict[str, tuple[str, str]] = {}
        self._row, self._column = 0, 0
        self._address, self._type = "", ""
        self._attributes: dict[str, str] | None = None
        self._formula: list[str] = []
        self._value: list[str] = []
        self._parser: Any = None

    def read(self, content: bytes) -> None:
        """Take the formulas out of the XML of a sheet, which the guard has seen before."""
        self._parser = expat.ParserCreate()
        self._parser.StartElementHandler = self._start
        self._parser.EndElementHandler = self._end
        self._parser.buffer_text = True
        self._parser.Parse(content, True)
        self._parser = None

    def text(self, place: Place) -> str:
        """Formula of a cell as a person would read it in that cell."""
        formula = self.cells[place]
        if formula.text or not formula.group:
            return formula.text
        text, origin = self._origins.get(formula.group, ("", ""))
        try:
            row, column = coordinate_to_tuple(origin)
            moved = Translator(text, origin).translate_formula(
                row_delta=place[0] - row, col_delta=place[1] - column
            )
        except (TokenizerError, TranslatorError, ValueError, IndexError):
            return text
        return str(moved)

    def _start(self, name: str, attributes: dict[str, str]) -> None:
        kind = name.rpartition(":")[2]
        if kind == "row":
            self._row, self._column = int(attributes.get("r") or self._row + 1), 0
        elif kind == "c":
            self._begin(attributes)
        elif kind == "f":
            self._attributes, self._formula = attributes, []
            self._parser.CharacterDataHandler = self._formula.append
        elif kind == "v" and self._attributes is not None:
            self._parser.CharacterDataHandler = self._value.append

    def _begin(self, attributes: dict[str, str]) -> None:
        self._type, self._attributes, self._value = attributes.get("t", ""), None, []
        self._address = attributes.get("r", "")
        if self._address:
            self._column = coordinate_to_tuple(self._address)[1]
        else:
            self._column += 1

    def _end(self, name: str) -> None:
        kind = name.rpartition(":")[2]
        if kind in ("f", "v"):
            self._parser.CharacterDataHandler = None
        elif kind == "c" and self._attributes is not None:
            self._keep(self._attributes)
            self._attributes = None

    def _keep(self, attributes: dict[str, str]) -> None:
        body = "".join(self._formula)
        text = f"={body}" if body else ""
        kind, group = attributes.get("t", ""), attributes.get("si", "")
        if kind == _SHARED and text and group not in self._origins:
            self._origins[group] = (text, self._address or "A1")
        unsaved = not "".join(self._value).strip() and self._type != "str"
        self.cells[self._row, self._column] = Formula(
            text, unsaved, kind in (_ARRAY, _TABLE), group if kind == _SHARED else ""
        )
