"""What makes a sheet as a whole unusable, said so that it can be mended."""

from __future__ import annotations


class SheetProblem(ValueError):
    """A workbook, folder or table that cannot be read as an extraction sheet.

    Parameters
    ----------
    message : what is wrong and what to do, as a clause that follows the place
    file : which file or folder
    sheet : which sheet in it
    cell : which cell, such as F143
    """

    def __init__(self, message: str, file: str = "", sheet: str = "", cell: str = "") -> None:
        place = ", ".join(
            part for part in (file, sheet and f"sheet '{sheet}'", cell and f"cell {cell}") if part
        )
        super().__init__(f"{place}: {message}" if place else message)
        self.file, self.sheet, self.cell = file, sheet, cell
