"""Which column holds what: own names, mapped names, and what is refused."""

import pytest
from sheet.typed_sheets import rows, settings, table

from drystone.sheet.intake import take_in
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import RawSheet


def intake_of(made, **config):
    return take_in(RawSheet("x.xlsx", made), settings(**config))


def refusal(made, **config):
    with pytest.raises(SheetProblem) as refused:
        intake_of(made, **config)
    return str(refused.value)


def renamed(names):
    return table([{names.get(key, key): value for key, value in rows({})[0].items()}])


def test_own_names_are_known_in_any_spelling():
    intake = intake_of(renamed({"control_mean": "Control mean", "study": "STUDY"}))
    assert intake.columns["control_mean"] == ("E", "Control mean")
    assert list(intake.rows["study"]) == ["Alder 2001"]
    assert intake.moderators == ()


def test_the_map_wins_over_own_names():
    made = table([{**rows({})[0], "ctl": 9.0}])
    intake = intake_of(made, columns={"control_mean": "ctl"})
    assert list(intake.rows["control_mean"]) == [9.0]
    assert intake.columns["control_mean"] == ("K", "ctl")
    assert list(intake.findings["rule"]) == ["reserved name"]


@pytest.mark.parametrize(
    ("made", "config", "words"),
    [
        (
            table([{"study": "A", "control_men": 1.0, "treatment_mean": 1.0}]),
            {},
            ["no column control_mean", "did you mean 'control_men'?", "columns: {control_mean"],
        ),
        (
            renamed({}),
            {"outcomes": {"yield": None, "height": None}, "columns": {"unit": "outcome"}},
            ["no column outcome"],
        ),
        (
            renamed({}),
            {"columns": {"control_mean": "ctl_mean"}},
            ["'ctl_mean'", "did you mean 'control_mean'?", "sheet 'comparisons'"],
        ),
        (
            renamed({}),
            {"columns": {"contol_mean": "control_mean"}},
            ["'contol_mean'", "did you mean 'control_mean'?"],
        ),
        (
            renamed({"unit": "Study"}),
            {},
            ["'study' (B1)", "'Study' (D1)", "both read as study"],
        ),
    ],
)
def test_columns_that_cannot_be_found_are_refused(made, config, words):
    message = refusal(made, **config)
    for word in words:
        assert word in message


def test_header_that_stands_twice_is_refused_with_both_addresses():
    made = table(rows({"a": 1, "b": 2}))
    twins = (*made.headers[:-1], "a")
    made = type(made)(made.name, twins, made.positions, made.columns, made.row_numbers)
    assert "'a' stands twice, in K1 and L1" in refusal(made)


def test_absent_outcome_column_is_filled_from_the_only_outcome():
    intake = intake_of(renamed({"outcome": "what"}))
    assert list(intake.rows["outcome"]) == ["yield"]
    assert "outcome" not in intake.columns
    assert intake.findings.empty
