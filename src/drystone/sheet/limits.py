"""How large a sheet may be, and what is said when it is larger."""

from __future__ import annotations

from pathlib import Path

from drystone.sheet.problems import SheetProblem

LARGEST_FILE = 60_000_000  # bytes on disk
MOST_ROWS = 200_000
MOST_COLUMNS = 1_000
MOST_CELLS = 2_000_000  # used rectangle; the reader holds every cell of it in memory
MOST_TEXT = 100_000_000  # characters, each repeat counted


def read_whole(path: Path) -> bytes:
    """Content of a file, read once so that what is checked is what is used.

    Raises
    ------
    SheetProblem
        When the file is absent, unreadable or larger than 60 MB.
    """
    try:
        if path.stat().st_size > LARGEST_FILE:
            raise SheetProblem(
                "is larger than 60 MB; keep the comparisons in a workbook of their own", str(path)
            )
        return path.read_bytes()
    except FileNotFoundError as error:
        raise SheetProblem(
            "does not exist; put the extraction sheet there, or change 'sheet' in the config",
            str(path),
        ) from error
    except OSError as error:
        raise SheetProblem(
            f"cannot be read ({error.strerror}); close it in other programs and look at its "
            "permissions",
            str(path),
        ) from error


def too_wide() -> str:
    """Sentence for a cell far outside any extraction sheet."""
    return (
        f"a value stands beyond {MOST_ROWS} rows or {MOST_COLUMNS} columns; delete the stray cell "
        "(and the rows or columns between) and save again"
    )


def too_many_cells() -> str:
    """Sentence for a used rectangle that would not fit in memory."""
    return (
        f"the used area has more than {MOST_CELLS} cells; delete stray values at its edges, or "
        "keep the comparisons in a workbook of their own"
    )
