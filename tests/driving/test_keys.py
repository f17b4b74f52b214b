"""Keys and plans without running the engine."""

from __future__ import annotations

import os

import pandas as pd
import pytest
from workflow.reviews import mini_sheet, write_review

from drystone.driving.files import read_json, write_json
from drystone.driving.perform import StepFailed, perform, say
from drystone.driving.plan import LONG_AGO, make_plan
from drystone.driving.steps import all_steps
from drystone.settings.load import settings_from

CONFIG = {"outcomes": {"biomass": None}, "strategies": ["complete cases"]}


@pytest.fixture
def review(tmp_path):
    return write_review(tmp_path, mini_sheet(), CONFIG)


def _perform_all(root) -> None:
    plan = make_plan(root)
    for name in plan.pending:
        perform(plan, name)
    make_plan(root).write_keys()


def test_steps_name_their_upstream_before_themselves():
    settings = settings_from({"sheet": "s", "outcomes": {"a": {}, "b": {}}})
    seen = set()
    for name, step in all_steps(settings).items():
        assert set(step.upstream) <= seen
        seen.add(name)
    outputs = [path for step in all_steps(settings).values() for path in step.outputs]
    assert len(outputs) == len(set(outputs))


def test_planning_writes_nothing(review):
    before = {path for path in review.rglob("*") if "sheets" not in path.parts}
    assert make_plan(review).pending
    after = {path for path in review.rglob("*") if "sheets" not in path.parts}
    assert after - before <= {review / "cache"}


def test_keys_of_finished_steps_are_old_and_of_pending_ones_new(review):
    _perform_all(review)
    plan = make_plan(review)
    assert plan.pending == {}
    plan.write_keys()
    for step in plan.steps.values():
        assert os.stat(review / step.key).st_mtime == LONG_AGO
    (review / plan.steps["effects/biomass"].outputs[0]).unlink()
    again = make_plan(review)
    assert "effects/biomass" in again.pending
    assert "slice/biomass" not in again.pending


def test_lost_record_of_a_step_makes_its_key_differ(review):
    """Outputs that nobody can vouch for run again, whatever the engine remembers."""
    _perform_all(review)
    plan = make_plan(review)
    step = plan.steps["slice/biomass"]
    (review / step.done).unlink()
    again = make_plan(review)
    assert "slice/biomass" in again.pending
    again.write_keys()
    assert read_json(review / step.key)["again"] == 1
    assert os.stat(review / step.key).st_mtime > LONG_AGO
    make_plan(review).write_keys()
    assert read_json(review / step.key)["again"] == 2


def test_damaged_cache_files_are_made_again(review):
    _perform_all(review)
    (review / "cache/keys/code.json").write_text("{")
    write_json(review / "cache/done/check.json", [1])
    assert set(make_plan(review).pending) == {"check", "publish"}


def test_digest_ignores_formatting_and_order(review):
    first = make_plan(review).keys["slice/biomass"]["digest"]
    path = review / "data/extraction/comparisons.csv"
    rows = pd.read_csv(path, dtype=str, keep_default_na=False)
    rows["control_n"] = rows["control_n"] + ".000"
    rows.iloc[::-1].to_csv(path, index=False)
    assert make_plan(review).keys["slice/biomass"]["digest"] == first


def test_failed_step_says_where_its_log_is_and_leaves_no_record(review):
    plan = make_plan(review)
    with pytest.raises(StepFailed, match=r"effects of biomass: .*cache/logs/effects/biomass.log"):
        perform(plan, "effects/biomass")  # its slice does not exist
    assert plan.record(plan.steps["effects/biomass"]) is None
    assert "Traceback" in (review / "cache/logs/effects/biomass.log").read_text()


def test_system_exit_in_a_stage_is_an_ordinary_failure(review, monkeypatch):
    from drystone.driving import perform as module

    def leave(plan, step):
        raise SystemExit(3)

    monkeypatch.setitem(module.STAGES, "check_sheet", leave)
    with pytest.raises(StepFailed):
        perform(make_plan(review), "check")


@pytest.mark.parametrize(
    ("error", "said"),
    [
        (OSError(28, "No space left on device"), "no space is left"),
        (OSError(30, "Read-only file system", "/x/y"), "cannot write /x/y"),
        (MemoryError(), "the memory is full"),
        (ValueError("first\nlast line"), "last line"),
        (KeyError(), "KeyError"),
    ],
)
def test_errors_become_sentences(error, said):
    assert said in say(error)
