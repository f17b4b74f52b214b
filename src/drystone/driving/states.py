"""States of the sheet: each is read once, stored under its digest, and asked for digests.

A digest covers exactly what one step needs, so that an edit reruns only the steps that it touches.
"""

from __future__ import annotations

import hashlib
import os
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any

from drystone.driving.files import read_json, write_json
from drystone.driving.fingerprint import CodeIndex, digest
from drystone.driving.review import Review
from drystone.settings.problems import ConfigProblem, nearest

if TYPE_CHECKING:
    import pandas as pd

    from drystone.settings.model import Analysis

SHEET_CODE = ("drystone.sheet.intake", "drystone.sheet.readers", "drystone.stages.intake_store")
DIGEST_CODE = ("drystone.stages.digest_rows", "drystone.stages.select_rows")
LABELS = ("date", "control_label", "treatment_label")
SHOWN_OF_ROWS = (
    "row_id",
    "study",
    "outcome",
    "species",
    *LABELS,
    "sheet",
    "sheet_row",
)


@dataclass
class SheetState:
    """One state of the sheet.

    Parameters
    ----------
    folder : where the stored intake is, or will be
    name : digest of file content, reading options and reading code
    inputs : SHA-256 of the sheet's files as they were read
    """

    review: Review
    folder: Path
    name: str
    inputs: dict[str, str] = field(default_factory=dict)
    _digests: dict[str, Any] = field(default_factory=dict)
    _tables: dict[str, pd.DataFrame] = field(default_factory=dict)
    _new: bool = False

    def slice_digest(self, analysis: Analysis) -> str:
        """Digest of the rows and columns that ``analysis`` needs.

        Raises
        ------
        ConfigProblem
            When a filter or a formula names a column that the sheet does not have.
        """
        asked = analysis.model_dump(include={"outcome", "where", "where_not", "models"})
        return self._digest("slice " + digest(asked), lambda: self._slice_content(analysis))

    def check_digest(self) -> str:
        """Digest of everything that the sheet says, notes and row order included."""
        return self._digest("check", self._check_content)

    def facts_digest(self) -> str:
        """Digest of what the report shows of the sheet: findings, ledger, labels, addresses."""
        return self._digest("facts", self._facts_content)

    def figures_digest(self, analysis: Analysis) -> str:
        """Digest of what the figures of ``analysis`` show of the sheet besides its numbers."""
        name = f"figures {digest(list(analysis.outcome))}"
        return self._digest(name, lambda: self._figures_content(analysis))

    def rows_left(self) -> tuple[int, dict[str, int]]:
        """Rows of the sheet, and how many left at the check by each rule."""

        def count() -> list[Any]:
            counts = self.table("ledger")["rule"].value_counts()
            by_rule = {str(rule): int(number) for rule, number in counts.items()}
            return [len(self.table("rows")), by_rule]

        rows, rules = self.remembered("rows left", count)
        return rows, rules

    def remembered(self, name: str, compute: Callable[[], Any]) -> Any:
        """What ``compute`` gives for this state of the sheet, computed once and then stored."""
        if name not in self._digests:
            self._digests[name] = compute()
            self._new = True
        return self._digests[name]

    def table(self, name: str) -> pd.DataFrame:
        """One stored table of the intake; the sheet is read when it has not been yet."""
        from drystone.stages.intake_store import load_table

        self.ensure()
        if name not in self._tables:
            self._tables[name] = load_table(self.folder, name)
        return self._tables[name]

    def ensure(self) -> None:
        """Read and store the sheet unless this state is stored already."""
        if (self.folder / "columns.json").exists():
            return
        from drystone.sheet.answers import read_answers
        from drystone.sheet.intake import take_in
        from drystone.sheet.readers import read_sheet
        from drystone.stages.intake_store import save_intake

        settings = self.review.settings
        raw = read_sheet(self.review.sheet_path(), settings.columns, settings.layout)
        bound = read_json(self.review.bound_answers) or {}
        answers = read_answers(self.review.answers, bound)
        intake = take_in(raw, settings, answers)
        if answers.newly_bound:
            write_json(self.review.bound_answers, {**bound, **answers.newly_bound})
        self.folder.parent.mkdir(parents=True, exist_ok=True)
        save_intake(intake, self.folder)

    def remember(self) -> None:
        """Store the digests, so that a run with nothing to do need not read the sheet."""
        if self._new and self.folder.exists():
            write_json(self.folder / "digests.json", self._digests)
            self._new = False

    def _digest(self, name: str, content: Any) -> str:
        return str(self.remembered(name, lambda: digest(content())))

    def _slice_content(self, analysis: Analysis) -> list[str]:
        from drystone.stages.digest_rows import digest_table
        from drystone.stages.select_rows import extra_columns, usable_rows

        rows = self.table("rows")
        for column in extra_columns(analysis):
            if column not in rows.columns:
                raise ConfigProblem(
                    f"an analysis of {' and '.join(analysis.outcome)} uses the column '{column}', "
                    f"which the sheet does not have; {nearest(column, rows.columns)}",
                    "config/config.yaml",
                )
        return [digest_table(usable_rows(rows, self.table("ledger"), analysis))]

    def _check_content(self) -> list[str]:
        from drystone.stages.digest_rows import digest_table

        names = ("rows", "studies", "findings", "accepted", "ledger", "derivations")
        return [digest_table(self.table(name)) for name in names]

    def _facts_content(self) -> list[str]:
        from drystone.stages.digest_rows import digest_table

        rows = self.table("rows")
        shown = rows[[name for name in SHOWN_OF_ROWS if name in rows.columns]]
        studies = self.table("studies").drop(columns="note")
        others = [self.table(name) for name in ("findings", "ledger", "derivations")]
        return [digest_table(table) for table in (shown, studies, *others)]

    def _figures_content(self, analysis: Analysis) -> list[str]:
        from drystone.stages.digest_rows import digest_table

        rows = self.table("rows")
        shown = rows.loc[rows["outcome"].isin(analysis.outcome), ["row_id", "study", *LABELS]]
        studies = self.table("studies")[["study", "year"]]
        return [digest_table(table.sort_values(list(table.columns))) for table in (shown, studies)]


def sheet_state(review: Review, code: CodeIndex) -> SheetState:
    """State of the review's sheet as it is on disk now; nothing is read but the file's bytes."""
    options = review.settings.model_dump(
        include={"columns", "layout", "defaults", "outcomes", "missing_n", "zero_sd"}
    )
    answered, bound = review.answers.is_file(), review.bound_answers
    reading = {
        "options": options,
        "path": review.settings.sheet,
        "bound answers": file_digest(bound) if answered and bound.is_file() else "",
    }
    inputs = {path.as_posix(): file_digest(review.root / path) for path in review.sheet_files()}
    if answered:
        inputs[review.answers.name] = file_digest(review.answers)
    modules = SHEET_CODE + DIGEST_CODE
    name = digest(
        [list(inputs.values()), reading, code.closure(modules), code.libraries(SHEET_CODE)]
    )
    folder = review.cache / "sheets" / name
    return SheetState(review, folder, name, inputs, read_json(folder / "digests.json") or {})


def file_digest(path: Path) -> str:
    """SHA-256 of a file's content."""
    total = hashlib.sha256()
    with path.open("rb") as file:
        while piece := file.read(1 << 20):
            total.update(piece)
    return total.hexdigest()


def forget_states(review: Review, wanted: set[str]) -> None:
    """Remove stored states of the sheet that no step refers to any more."""
    import shutil

    folder = review.cache / "sheets"
    for path in folder.iterdir() if folder.is_dir() else ():
        if path.name not in wanted and not path.name.startswith(f".{os.getpid()}"):
            shutil.rmtree(path, ignore_errors=True)
