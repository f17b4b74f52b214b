"""Why a step will run, down to the cell; reads keys and stored states of the sheet only."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from drystone.driving.plan import Pending, Plan

if TYPE_CHECKING:
    import pandas as pd

MOST_CELLS = 5
LEFT_OUT = "left out by an answer"  # as in sheet/findings/answered.py, too heavy to load here


@dataclass(frozen=True)
class Reason:
    """A step that will run and why; ``own`` is False when only steps above it changed."""

    step: str
    phrase: str
    since: tuple[str, ...]
    own: bool


def reasons(plan: Plan) -> list[Reason]:
    """Every step that will run, in running order, each with its root causes."""
    found: dict[str, Reason] = {}
    for name, item in plan.pending.items():
        own = tuple(_own_causes(plan, item))
        inherited = tuple(
            cause for above in item.step.upstream if above in found for cause in found[above].since
        )
        since = tuple(dict.fromkeys(own or inherited)) or ("a step above it runs",)
        found[name] = Reason(name, item.step.phrase, since, bool(own))
    return list(found.values())


def _own_causes(plan: Plan, item: Pending) -> Iterator[str]:
    if item.before is None:
        yield _never(plan, item)
        return
    old, new = item.before["parts"], item.now["parts"]
    if old.get("rows") != new.get("rows"):
        yield from _row_causes(plan, item)
    yield from _setting_causes(old["settings"], new["settings"], "")
    for module in sorted(set(old["code"]) | set(new["code"])):
        if old["code"].get(module) != new["code"].get(module):
            yield f"the code of {module} changed"
    for library in sorted(set(old["libraries"]) | set(new["libraries"])):
        before, after = old["libraries"].get(library), new["libraries"].get(library)
        if before != after:
            yield f"{library} went {before or 'absent'} -> {after or 'absent'}"
    for name in sorted(set(old["upstream"]) ^ set(new["upstream"])):
        gone = name not in new["upstream"]
        yield f"{'gone' if gone else 'new'}: {_phrase(plan, name)}"
    for path in item.missing:
        yield f"{path} is missing, damaged or was changed"


def _never(plan: Plan, item: Pending) -> str:
    root = plan.review.root
    if any((root / path).exists() for path in item.step.outputs):
        return "it did not finish last time"
    return "it has not run yet"


def _phrase(plan: Plan, name: str) -> str:
    return plan.steps[name].phrase if name in plan.steps else name.replace("/", " / ")


def _setting_causes(old: Any, new: Any, path: str) -> Iterator[str]:
    if old == new:
        return
    if isinstance(old, dict) and isinstance(new, dict):
        for key in sorted(set(old) | set(new)):
            yield from _setting_causes(
                old.get(key), new.get(key), f"{path}: {key}" if path else key
            )
        return
    if old is None or new is None:
        yield f"option {path} is {'new' if old is None else 'gone'}"
        return
    yield f"option {path} went {_brief(old)} -> {_brief(new)}"


def _brief(value: Any) -> str:
    text = ", ".join(map(str, value)) if isinstance(value, list) else str(value)
    return (text if len(text) <= 60 else f"{text[:57]}...") or "blank"


def _row_causes(plan: Plan, item: Pending) -> Iterator[str]:
    from drystone.stages.intake_store import load_columns, load_table

    before = item.before or {}
    folder = plan.review.cache / "sheets" / str(before.get("state", ""))
    if not (folder / "columns.json").exists():
        yield "the sheet changed (its earlier state is no longer stored)"
        return
    plan.state.ensure()
    columns = _columns_of(plan, item)
    old, new = load_table(folder, "rows"), plan.state.table("rows")
    if item.step.rows in ("slice", "figures"):
        wanted = plan.review.settings.all_analyses()[item.step.analysis].outcome
        old, new = old[old["outcome"].isin(wanted)], new[new["outcome"].isin(wanted)]
    letters = {name: entry[0] for name, entry in load_columns(plan.state.folder).items()}
    causes = list(_changed_rows(old, new, columns, letters))
    causes += _changed_answers(plan, folder, item.step.rows)
    if item.step.rows != "slice":
        studies = load_table(folder, "studies"), plan.state.table("studies")
        causes += list(_changed_studies(*studies))
    yield from _shortened(causes) or ["the sheet changed"]


def _changed_answers(plan: Plan, before: Path, needs: str) -> Iterator[str]:
    """Answers that hold now and did not before, or the other way round."""
    from drystone.stages.intake_store import load_table

    names = ["ledger"] if needs in ("slice", "figures") else ["ledger", "accepted"]
    for name in names:
        try:
            old, new = load_table(before, name), plan.state.table(name)
        except FileNotFoundError:  # stored before there were answers
            continue
        if name == "ledger":
            old, new = (table[table["rule"] == LEFT_OUT] for table in (old, new))
        pairs = [set(zip(t["row_id"].fillna(""), t["rule"], strict=True)) for t in (old, new)]
        for row, rule in sorted(pairs[0] ^ pairs[1]):
            word = "holds now" if (row, rule) in pairs[1] else "does not hold any more"
            where = f"row {row}" if row else "the sheet"
            yield f"an answer about {where} ({rule}) {word}"


def _columns_of(plan: Plan, item: Pending) -> list[str]:
    """Columns whose cells can be behind a change of this step's rows."""
    from drystone.driving.states import LABELS, SHOWN_OF_ROWS
    from drystone.stages.select_rows import extra_columns
    from drystone.tables.comparisons import COLUMNS, NUMBERS_USED

    everything = [name for name in plan.state.table("rows").columns if not _internal(name)]
    if item.step.rows == "check":
        return everything
    if item.step.rows == "facts":
        shown = dict.fromkeys([*SHOWN_OF_ROWS, *NUMBERS_USED, *everything])
        return [name for name in shown if not _internal(name)]
    if item.step.rows == "figures":
        return ["study", *LABELS]
    analysis = plan.review.settings.all_analyses()[item.step.analysis]
    named = [*NUMBERS_USED, *extra_columns(analysis)]
    return [name for name in dict.fromkeys(named) if name in COLUMNS or name in everything]


def _internal(name: str) -> bool:
    return name in ("sheet", "sheet_row", "sd_pooled") or name.endswith(("_sd_value", "_sd_rule"))


def _changed_rows(
    old: pd.DataFrame, new: pd.DataFrame, columns: list[str], letters: dict[str, str]
) -> Iterator[str]:
    before = old.drop_duplicates("row_id").set_index("row_id")
    after = new.drop_duplicates("row_id").set_index("row_id")
    for row in after.index.difference(before.index, sort=False):
        yield f"row {row} is new ({_place(after, row)})"
    for row in before.index.difference(after.index, sort=False):
        yield f"row {row} is gone"
    both = after.index.intersection(before.index, sort=False)
    for name in columns:
        if name == "row_id" or name not in before.columns or name not in after.columns:
            continue
        for row in _different(before.loc[both, name], after.loc[both, name]):
            where = _address(after, row, letters.get(name))
            change = f"{_value(before.at[row, name])} -> {_value(after.at[row, name])}"
            yield f"{where} {name} went {change} (row {row})"
    if not before.index.equals(after.index) and set(before.index) == set(after.index):
        yield "rows stand in another order"


def _different(before: pd.Series, after: pd.Series) -> list[str]:
    same = (before == after) | (before.isna() & after.isna())
    return list(after.index[~same.fillna(False).to_numpy(dtype=bool)])


def _address(rows: pd.DataFrame, row: str, letter: str | None) -> str:
    sheet, number = rows.at[row, "sheet"], int(rows.at[row, "sheet_row"])
    return f"{sheet}!{letter}{number}" if letter else f"{sheet}, row {number}:"


def _place(rows: pd.DataFrame, row: str) -> str:
    return f"{rows.at[row, 'sheet']}, row {int(rows.at[row, 'sheet_row'])}"


def _value(value: object) -> str:
    if value is None or value != value:
        return "blank"
    return f"{value:.12g}" if isinstance(value, float) else str(value)


def _changed_studies(old: pd.DataFrame, new: pd.DataFrame) -> Iterator[str]:
    before = old.drop_duplicates("study").set_index("study")
    after = new.drop_duplicates("study").set_index("study")
    for study in after.index.difference(before.index, sort=False):
        yield f"study {study} is new in the studies sheet"
    for study in before.index.difference(after.index, sort=False):
        yield f"study {study} is gone from the studies sheet"
    both = after.index.intersection(before.index, sort=False)
    for name in after.columns.intersection(before.columns):
        for study in _different(before.loc[both, name], after.loc[both, name]):
            change = f"{_value(before.at[study, name])} -> {_value(after.at[study, name])}"
            yield f"studies: {name} of {study} went {change}"


def _shortened(causes: list[str]) -> list[str]:
    if len(causes) <= MOST_CELLS:
        return causes
    return [*causes[:MOST_CELLS], f"and {len(causes) - MOST_CELLS} more changes of the sheet"]
