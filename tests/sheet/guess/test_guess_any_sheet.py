"""No content of a sheet makes the guesses fail in any other way than with a sentence."""

import pytest
from hypothesis import HealthCheck, given
from hypothesis import settings as budget
from hypothesis import strategies as st
from sheet.guess.messy_sheets import NUMBERS

from drystone.settings.load import parse_settings
from drystone.settings.problems import ConfigProblem
from drystone.sheet.guess.config_text import config_text
from drystone.sheet.guess.proposal import propose
from drystone.sheet.guess.screen import guess_lines
from drystone.sheet.problems import SheetProblem
from drystone.sheet.sources import Source

WORDS = ["mean", "SD", "n", "control", "treatment", "T", "C", "urban", "rural", "study", "(t/ha)"]
CELL = st.one_of(
    st.none(),
    st.text(max_size=8),
    st.floats(allow_nan=False),
    st.sampled_from(["NA", "3,5", "2001", *WORDS]),
    st.lists(st.sampled_from(WORDS), min_size=1, max_size=3).map(" ".join),
)


@budget(max_examples=150, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(st.lists(st.lists(CELL, max_size=8), max_size=8))
def test_any_cells(grid):
    try:
        proposal = propose([Source("a", grid), Source("b", [["x"]])], "x.xlsx")
    except SheetProblem:
        return
    _reads_back(proposal)


@budget(max_examples=100, deadline=None)
@given(
    st.lists(st.text(min_size=1, max_size=12), min_size=4, max_size=4),
    st.lists(st.text(max_size=12), min_size=4, max_size=4),
    st.text(max_size=12),
)
def test_any_outcomes_units_and_headers(outcomes, units, header):
    head = ["study", "C_mean", "C_sd", "C_n", "T_mean", "T_sd", "T_n", "outcome", "unit", header]
    rows = [(*row, *pair, 1) for row, *pair in zip(NUMBERS, outcomes, units, strict=True)]
    try:
        proposal = propose([Source("a", [head, *rows])], "x.xlsx")
    except SheetProblem:
        return
    _reads_back(proposal)


def _reads_back(proposal):
    guess_lines(proposal, "x.xlsx")
    text = config_text(proposal, "x.xlsx", "x.xlsx")
    if not any(item.scale == "ratio" for item in proposal.outcomes):
        with pytest.raises(ConfigProblem, match=r"ratio scale|at least one outcome"):
            parse_settings(text)
        return
    read = parse_settings(text)
    assert read.columns == {found.ours: found.theirs for found in proposal.columns}
    assert list(read.outcomes) == [item.name for item in proposal.outcomes]
