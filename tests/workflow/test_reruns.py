"""Edits and what reruns: `why` says before each run exactly what then runs.

Every data edit is made twice: with the engine's own records, and after they were deleted (as in a
fresh clone), because then only keys and time stamps are left to decide.
"""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pandas as pd
import pytest
import yaml
from workflow.reviews import explained, run_review, write_config, write_review

PACKAGE = Path(__file__).resolve().parents[2]
CONFIG = {
    "sheet": "data/extraction",
    "outcomes": {"yield": {"unit": "t/ha"}, "cover": {"unit": "%"}},
    "analyses": {
        "yield": {"outcome": "yield", "models": {"overall": "~ 1", "crop": "~ crop"}},
        "cover": {"outcome": "cover"},
    },
}
STRATEGIES = ("complete cases", "missing cases", "all cases", "all cases on complete rows")


def _rows() -> pd.DataFrame:
    """Invented rows: two outcomes, a shared control, a few SDs missing."""
    rows = []
    for number in range(24):
        study, outcome = f"Place {number // 3}", ("yield", "cover")[number % 2]
        rows.append(
            {
                "row_id": f"R{number:02d}",
                "study": study,
                "outcome": outcome,
                "unit": {"yield": "t/ha", "cover": "%"}[outcome],
                "crop": ("oats", "rye")[(number // 2) % 2],
                "control_id": f"c{number}",
                "treatment_id": f"t{number}",
                "control_mean": 10 + number % 5,
                "control_sd": "" if number % 7 == 3 else 2 + 0.1 * number,
                "control_n": 4 + number % 3,
                "treatment_mean": 12 + number % 6,
                "treatment_sd": "" if number % 7 == 3 else 2.5 + 0.1 * number,
                "treatment_n": 5,
                "note": f"note {number}",
            }
        )
    return pd.DataFrame(rows).astype(str)


def _studies() -> pd.DataFrame:
    names = [f"Place {number}" for number in range(8)]
    return pd.DataFrame({"study": names, "citation": [f"Invented {name}" for name in names]})


@pytest.fixture(scope="module")
def review(tmp_path_factory):
    """A review that was run, with an accent and a space in its path."""
    root = tmp_path_factory.mktemp("écologie du pré") / "revue vivante"
    root.mkdir()
    write_review(root, _rows(), {k: v for k, v in CONFIG.items() if k != "sheet"}, _studies())
    run_review(root)
    return root


def _sheet(root: Path) -> Path:
    return root / "data/extraction/comparisons.csv"


def _edit(root: Path, change: Callable[[pd.DataFrame], pd.DataFrame]) -> None:
    change(pd.read_csv(_sheet(root), dtype=str, keep_default_na=False)).to_csv(
        _sheet(root), index=False
    )


def _set(row: str, column: str, value: str) -> Callable[[pd.DataFrame], pd.DataFrame]:
    def change(rows: pd.DataFrame) -> pd.DataFrame:
        rows.loc[rows["row_id"] == row, column] = value
        return rows

    return change


def _chain(name: str, models: tuple[str, ...], of: tuple[str, ...] = STRATEGIES) -> set[str]:
    """All steps of one analysis below and with its slice."""
    steps = {f"slice/{name}", f"effects/{name}", f"compare/{name}", f"figures/{name}"}
    return steps | _strategies(name, models, of)


def _strategies(name: str, models: tuple[str, ...], of: tuple[str, ...]) -> set[str]:
    steps = {f"sampling/{name}/{strategy}" for strategy in of}
    return steps | {f"fit/{name}/{strategy}/{model}" for strategy in of for model in models}


YIELD = _chain("yield", ("overall", "crop"))
PAGE = {"check", "report", "publish"}
AFTER_FITS = {"compare/yield", "figures/yield", "report", "publish"}


def _add_row(rows: pd.DataFrame) -> pd.DataFrame:
    new = rows[rows["outcome"] == "yield"].iloc[[0]].assign(row_id=f"N{len(rows)}")
    new = new.assign(control_id=f"c{len(rows)}", treatment_id=f"t{len(rows)}", study="Place 9")
    return pd.concat([rows, new], ignore_index=True)


DATA_EDITS = {
    "a note": (_set("R04", "note", "read again {}"), {"check", "publish"}),
    "rows in another order": (lambda rows: rows.iloc[::-1], PAGE),
    "19 becomes 19.000": (_set("R02", "control_n", "{}6.000"), set()),
    "one cell of one outcome": (_set("R02", "control_mean", "1{}.5"), PAGE | YIELD),
    "a row of one outcome": (_add_row, PAGE | YIELD),
}


def _numbered(change: Callable, name: str, time: int) -> Callable:
    """The same edit with another value, so that the second time is an edit again."""
    if name == "19 becomes 19.000":
        return _set("R02", "control_n", "6.000" if time == 1 else "6.0000")
    if name == "a note":
        return _set("R04", "note", f"read again {time}")
    if name == "one cell of one outcome":
        return _set("R02", "control_mean", f"1{time}.5")
    return change


def _check_edit(root: Path, expected: set[str]) -> None:
    """`why` names the expected steps, the run does the same, and then nothing is left."""
    said = {reason.step for reason in explained(root)}
    outcome = run_review(root)
    assert said == expected
    assert set(outcome.ran) == expected
    assert len(outcome.ran) == len(expected)
    assert explained(root) == []


@pytest.mark.parametrize("records", ["kept", "deleted"])
@pytest.mark.parametrize("name", DATA_EDITS)
def test_data_edit_reruns_only_what_it_touches(review, name, records):
    if records == "deleted":
        shutil.rmtree(review / ".snakemake")
    change, expected = DATA_EDITS[name]
    _edit(review, _numbered(change, name, 1 if records == "kept" else 2))
    _check_edit(review, expected)


@pytest.mark.parametrize("records", ["kept", "deleted"])
def test_citation_reruns_check_and_page(review, records):
    if records == "deleted":
        shutil.rmtree(review / ".snakemake")
    path = review / "data/extraction/studies.csv"
    path.write_text(path.read_text().replace("Invented Place 3", f"Invented Place 3, {records}"))
    _check_edit(review, PAGE)


@pytest.mark.parametrize("records", ["kept", "deleted"])
def test_edit_taken_back_reruns_nothing(review, records):
    before = _sheet(review).read_bytes()
    _edit(review, _set("R06", "control_mean", "99"))
    assert len(explained(review)) == len(YIELD | PAGE)
    command = [sys.executable, "-m", "snakemake", "--dry-run", "--quiet"]
    snakefile = PACKAGE / "workflow" / "Snakefile"
    told = subprocess.run(
        [*command, "--cores", "1", "--snakefile", str(snakefile), "--rerun-triggers", "mtime"],
        cwd=review,
        capture_output=True,
        text=True,
        check=False,
    )
    assert told.returncode == 0, told.stderr  # this wrote the keys of the edited sheet
    _sheet(review).write_bytes(before)
    if records == "deleted":
        shutil.rmtree(review / ".snakemake")
    _check_edit(review, set())


def test_nothing_reruns_nothing(review):
    os.utime(_sheet(review))
    _check_edit(review, set())


def test_strategy_option_reruns_that_strategy(review):
    config = {**CONFIG, "strategies": ["complete cases", "missing cases", _ALL_CASES_SQUARES]}
    write_config(review, config)
    of = ("all cases", "all cases on complete rows")
    expected = {"compare/yield", "compare/cover", "figures/yield", "figures/cover"}
    expected |= {"report", "publish"}
    expected |= _strategies("yield", ("overall", "crop"), of)
    expected |= _strategies("cover", ("overall",), of)
    reason = next(r for r in explained(review) if r.step == "sampling/yield/all cases")
    wanted = "option strategy: average_cv went square of mean -> mean of squares"
    assert reason.since == (wanted,)
    # the row sets of the side-by-side table did not change, so it reruns for the fits above it
    _check_edit(review, expected)


_ALL_CASES_SQUARES = {"all cases": {"average_cv": "mean of squares"}}


def test_removed_analysis_reruns_page_and_is_named(review):
    present = yaml.safe_load((review / "config/config.yaml").read_text())
    del present["analyses"]["cover"]
    write_config(review, present)
    _check_edit(review, {"report", "publish"})
    from drystone.driving.plan import make_plan

    assert make_plan(review).leftovers() == ["cache/analyses/cover"]
    assert not (review / "results/tables/cover").exists()


def test_lost_result_is_made_again(review):
    shutil.rmtree(review / "results")
    _check_edit(review, {"publish"})


def test_why_names_the_cell(review):
    _edit(review, _set("R08", "control_mean", "4.4"))
    reason = next(r for r in explained(review) if r.step == "fit/yield/all cases/overall")
    assert reason.phrase == "fit of yield / all cases / overall"
    (cause,) = reason.since
    column = list(pd.read_csv(_sheet(review)).columns).index("control_mean")
    rows = pd.read_csv(_sheet(review))
    line = rows.index[rows["row_id"] == "R08"][0] + 2
    cell = f"comparisons.csv!{chr(ord('A') + column)}{line}"
    assert cause.startswith(f"{cell} control_mean went ")
    assert cause.endswith("-> 4.4 (row R08)")
    run_review(review)


def test_why_names_new_and_gone_rows(review):
    rows = pd.read_csv(_sheet(review), dtype=str, keep_default_na=False)
    gone = rows[rows["outcome"] == "yield"]["row_id"].iloc[1]
    kept = rows[rows["row_id"] != gone]
    added = _add_row(kept).replace({"row_id": {f"N{len(kept)}": "brand new"}})
    added.to_csv(_sheet(review), index=False)
    causes = next(r for r in explained(review) if r.step == "slice/yield").since
    assert any(cause.startswith("row brand new is new (comparisons.csv, row ") for cause in causes)
    assert f"row {gone} is gone" in causes
    run_review(review)


# --- code edits: in a copy of the package, in processes of their own -------------------------

SCRIPT = """
import json, sys
from pathlib import Path
from drystone.driving.front import run
from drystone.driving.plan import make_plan
from drystone.driving.why import reasons
root = Path(sys.argv[1])
said = {r.step: list(r.since) for r in reasons(make_plan(root))}
outcome = run(root, 2, lambda plan: None, lambda event: None)
print(json.dumps({"said": said, "ran": outcome.ran, "failures": outcome.failures}))
"""


@pytest.fixture(scope="module")
def copied(tmp_path_factory, review):
    """Copy of the package whose code may be edited, and the review in its present state."""
    base = tmp_path_factory.mktemp("copy")
    for name in ("src", "workflow", "data_template"):
        ignore = shutil.ignore_patterns("__pycache__")
        shutil.copytree(PACKAGE / name, base / name, ignore=ignore)
    _run_copy(base, review)
    return base


def _run_copy(base: Path, root: Path) -> dict:
    environment = {**os.environ, "PYTHONPATH": str(base / "src")}
    done = subprocess.run(
        [sys.executable, "-c", SCRIPT, str(root)],
        env=environment,
        capture_output=True,
        text=True,
        check=True,
    )
    found = json.loads(done.stdout.splitlines()[-1])
    assert found["failures"] == []
    return found


def test_comment_and_docstring_rerun_nothing(copied, review):
    path = copied / "src/drystone/maths/log_ratio.py"
    text = path.read_text()
    assert '"""Log response ratio with its delta-method variance.' in text
    text = text.replace("Log response ratio with its delta", "Ratio, logged, with its delta")
    path.write_text(text + "\n# a comment\n")
    assert _run_copy(copied, review) == {"said": {}, "ran": [], "failures": []}


def test_body_of_one_stage_reruns_it_and_what_follows(copied, review):
    path = copied / "src/drystone/stages/compare_strategies.py"
    path.write_text(path.read_text().replace('"positive"', '"above zero"'))
    found = _run_copy(copied, review)
    assert set(found["said"]) == AFTER_FITS == set(found["ran"])
    wanted = ["the code of drystone.stages.compare_strategies changed"]
    assert found["said"]["compare/yield"] == wanted


def test_body_of_one_strategy_reruns_that_strategy(copied, review):
    path = copied / "src/drystone/stages/strategies/missing_cases.py"
    path.write_text(path.read_text().replace("everywhere=False", "everywhere=bool(0)"))
    found = _run_copy(copied, review)
    expected = _strategies("yield", ("overall", "crop"), ("missing cases",))
    expected |= AFTER_FITS
    assert set(found["said"]) == expected == set(found["ran"])
