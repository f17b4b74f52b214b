"""The marked copy in a review: written by the check, published by the run, never in the way."""

from __future__ import annotations

import hashlib

import openpyxl
import pytest
from workflow.reviews import mini_sheet, write_review

from drystone.driving import folders
from drystone.driving.checking import check_review
from drystone.driving.perform import perform
from drystone.driving.plan import make_plan
from drystone.stages.publish_results import _put_marked_copy

NAME = "extraction marked.xlsx"


@pytest.fixture
def review(tmp_path):
    rows = mini_sheet().astype(str)
    rows.loc[3, "control_mean"] = "about 5"
    return write_review(tmp_path / "review", rows, {"outcomes": {"biomass": None}})


def test_check_writes_the_marked_copy_and_says_where(review):
    said: list[str] = []
    assert check_review(review, said.append)
    assert said[-1].endswith(f"results/check/{NAME}")
    book = openpyxl.load_workbook(review / "results/check" / NAME)
    assert book["comparisons.csv"]["H5"].comment is not None
    (review / f"results/check/.~lock.{NAME}#").write_text("")
    before = hashlib.sha256((review / "results/check" / NAME).read_bytes()).hexdigest()
    check_review(review, said.append)
    assert "extraction marked 2.xlsx" in said[-1]
    assert "is open in another program" in said[-1]
    assert hashlib.sha256((review / "results/check" / NAME).read_bytes()).hexdigest() == before


def test_check_of_an_empty_template_marks_nothing(tmp_path):
    folders.start(tmp_path / "new")
    said: list[str] = []
    check_review(tmp_path / "new", said.append)
    book = openpyxl.load_workbook(tmp_path / "new/results/check" / NAME)
    assert book.sheetnames[:2] == ["marked copy", "findings"]


def test_step_follows_the_sheet_and_is_published(review):
    plan = make_plan(review)
    perform(plan, "mark")
    assert (review / "cache/check/marked.xlsx").exists()
    plan.remember()
    again = make_plan(review)
    assert "mark" not in again.pending
    path = review / "data/extraction/comparisons.csv"
    path.write_text(path.read_text().replace("about 5", "about 6"))
    assert "mark" in make_plan(review).pending


def test_publishing_carries_an_open_copy_over(review):
    perform(make_plan(review), "mark")
    old, new = review / "results/check", review / ".results-new/check"
    old.mkdir(parents=True)
    new.mkdir(parents=True)
    (old / NAME).write_text("open in a program")
    (old / f".~lock.{NAME}#").write_text("lock")
    _put_marked_copy(review, make_plan(review).review.settings, new)
    assert (new / NAME).read_text() == "open in a program"
    assert sorted(path.name for path in new.iterdir()) == [
        f".~lock.{NAME}#",
        "extraction marked 2.xlsx",
        NAME,
    ]
    (old / f".~lock.{NAME}#").unlink()
    (new / f".~lock.{NAME}#").unlink()
    _put_marked_copy(review, make_plan(review).review.settings, new)
    assert [path.name for path in new.iterdir()] == [NAME]
    assert openpyxl.load_workbook(new / NAME).sheetnames[0] == "marked copy"
