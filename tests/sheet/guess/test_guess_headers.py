"""Header names in common forms; every sheet is invented."""

import pytest
from sheet.guess.messy_sheets import ARM_COLUMNS, NUMBERS, guess, mapping

from drystone.sheet.guess.fields import quantity_of
from drystone.sheet.guess.split import split_header
from drystone.sheet.problems import SheetProblem

STYLES = {
    "letters first": ["C_mean", "C_sd", "C_n", "T_mean", "T_sd", "T_n"],
    "letters last": ["mean_c", "sd_c", "n_c", "mean_t", "sd_t", "n_t"],
    "glued": ["Xc", "SDc", "Nc", "Xt", "SDt", "Nt"],
    "experimental": ["Xc", "Sc", "Nc", "Xe", "SDe", "Ne"],
    "short words": ["ctrl mean", "ctrl SD", "ctrl n", "trt mean", "trt SD", "trt n"],
    "spelt out": [
        *("Mean of the control", "Standard deviation (control)", "Sample size, control"),
        *("Mean of the treatment", "Standard deviation (treatment)", "Sample size, treatment"),
    ],
    "camel": ["controlMean", "controlSD", "controlN", "treatMean", "treatSD", "treatN"],
    "brackets": [
        *("Mean (control)", "SD (control)", "n (control)"),
        *("Mean (treated)", "SD (treated)", "n (treated)"),
    ],
    "units": [
        *("Control mean (t/ha)", "Control SD (t/ha)", "Control reps"),
        *("Treatment mean (t/ha)", "Treatment SD (t/ha)", "Treatment reps"),
    ],
    "no word for the mean": [
        *("Control", "Control_std", "Control_N", "Treated"),
        *("Treated_std", "Treated_N"),
    ],
    "yield for the mean": ["yield_ck", "sd_ck", "n_ck", "yield_trt", "sd_trt", "n_trt"],
    "dots": ["mean.C", "S.D. C", "n.C", "mean.T", "S.D. T", "n.T"],
    "control beside a name": [
        *("mean_control", "sd_control", "n_control"),
        *("mean_biochar", "sd_biochar", "n_biochar"),
    ],
    "negated": [
        *("ungrazed_mean", "ungrazed_sd", "ungrazed_n"),
        *("grazed_mean", "grazed_sd", "grazed_n"),
    ],
}


@pytest.mark.parametrize("style", list(STYLES))
def test_arms_are_told_in_common_forms(style):
    headers = STYLES[style]
    proposal = guess(["Paper", *headers], *NUMBERS)
    found = mapping(proposal)
    assert {ours: found.get(ours) for ours in ARM_COLUMNS} == dict(
        zip(ARM_COLUMNS, headers, strict=True)
    )
    assert found["study"] == "Paper"
    assert not [ask for ask in proposal.asks if "which arm" in ask]


@pytest.mark.parametrize("style", list(STYLES))
def test_order_of_the_columns_does_not_matter_where_words_tell_the_arms(style):
    headers, rows = STYLES[style], [(*row[4:], *row[1:4], row[0]) for row in NUMBERS]
    found = mapping(guess([*headers[3:], *headers[:3], "Paper"], *rows))
    assert found["control_mean"] == headers[0]
    assert found["treatment_n"] == headers[5]


@pytest.mark.parametrize(
    ("first", "second", "control", "asks"),
    [
        ("urban", "rural", "rural", True),
        ("rural", "urban", "rural", True),
        ("north", "south", "north", True),
        ("south", "north", "south", True),
        ("burned", "unburned", "unburned", False),
        ("low", "high", "low", True),
    ],
)
def test_arms_with_names_of_their_own_are_found_in_pairs(first, second, control, asks):
    headers = [f"{name}_{what}" for name in (first, second) for what in ("mean", "sd", "n")]
    proposal = guess(["study_ID", *headers], *NUMBERS)
    found = mapping(proposal)
    assert found["control_mean"] == f"{control}_mean"
    assert found["control_n"] == f"{control}_n"
    assert found["treatment_sd"] == f"{first if control == second else second}_sd"
    assert bool([ask for ask in proposal.asks if "which arm is the control" in ask]) == asks


def test_numbered_arms_are_taken_in_order_and_asked_about():
    proposal = guess(["ref", "Mean1", "SD1", "n1", "Mean2", "SD2", "n2"], *NUMBERS)
    found = mapping(proposal)
    assert (found["control_mean"], found["treatment_n"]) == ("Mean1", "n2")
    assert "stands first" in proposal.asks[0]


def test_se_beside_sd_is_named_and_not_used():
    rows = [(*row, 0.2, 0.3) for row in NUMBERS]
    rows[1] = (*NUMBERS[1][:2], "NA", *NUMBERS[1][3:], 0.2, 0.3)
    proposal = guess(["study", *STYLES["letters first"], "C_se", "T_se"], *rows)
    assert mapping(proposal)["control_sd"] == "C_sd"
    assert "control_spread" not in mapping(proposal)
    spare = {found.ours: (found.theirs, found.reason) for found in proposal.spare}
    assert spare["control_spread"][0] == "C_se"
    assert "1 rows have only this" in spare["control_spread"][1]
    assert "no row has only this" in spare["treatment_spread"][1]


@pytest.mark.parametrize(
    ("word", "kind"), [("SE", "SE"), ("std error", "SE"), ("variance", "variance"), ("CV", "CV%")]
)
def test_another_spread_than_sd_becomes_the_spread_with_its_kind(word, kind):
    headers = ["mean C", f"{word} C", "n C", "mean T", f"{word} T", "n T"]
    proposal = guess(["study", *headers], *NUMBERS)
    assert mapping(proposal)["treatment_spread"] == f"{word} T"
    assert proposal.spread_kind == kind


def test_column_with_kinds_of_spread_serves_both_arms():
    headers = ["mean C", "error C", "n C", "mean T", "error T", "n T", "what is it"]
    rows = [(*row, kind) for row, kind in zip(NUMBERS, ("SE", "SD", "se", "CI"), strict=True)]
    proposal = guess(["study", *headers], *rows)
    found = mapping(proposal)
    assert found["control_spread"] == "error C"
    assert found["control_spread_kind"] == found["treatment_spread_kind"] == "what is it"
    assert proposal.spread_kind == ""


def test_limits_are_told_from_arms_called_low_and_high():
    headers = ["mean C", "lower CI C", "upper CI C", "mean T", "lower CI T", "upper CI T", "reps"]
    proposal = guess(["study", *headers], *((*row, 4) for row in NUMBERS))
    found = mapping(proposal)
    assert (found["control_lower"], found["treatment_upper"]) == ("lower CI C", "upper CI T")
    assert found["control_n"] == found["treatment_n"] == "reps"
    assert "total of both arms" in " ".join(proposal.asks)


def test_nitrogen_rate_is_no_number_of_replicates():
    rows = [(*row, 60) for row in NUMBERS]
    proposal = guess(["study", *STYLES["letters first"], "N rate (kg/ha)"], *rows)
    assert mapping(proposal)["control_n"] == "C_n"
    assert proposal.moderators == ("N rate (kg/ha)",)


def test_sheet_without_means_says_what_was_looked_for():
    with pytest.raises(SheetProblem, match="no two columns look like the means"):
        guess(["study", "crop", "depth"], ["A", "oat", 3], ["B", "rye", 4])


def test_sheet_without_studies_says_so():
    with pytest.raises(SheetProblem, match="no column names the study"):
        guess(["mean_c", "mean_t", "n_c", "n_t"], [1.5, 2.5, 3, 3], [2.5, 3.5, 4, 4])


@pytest.mark.parametrize(
    ("header", "words", "unit"),
    [
        ("SD (control)", ("sd", "control"), ""),
        ("Yield [t/ha]", ("yield",), "t/ha"),
        ("Yield (t)", ("yield",), "t"),
        ("Mean (T)", ("mean", "t"), ""),
        ("Xc", ("mean", "c"), ""),
        ("obsID", ("obs", "id"), ""),
        ("site", ("site",), ""),
        ("± control", ("±", "control"), ""),
    ],
)
def test_header_is_split_into_words_and_unit(header, words, unit):
    assert split_header(header) == (words, unit)


@pytest.mark.parametrize(
    ("words", "quantity"),
    [
        (("standard", "error", "of", "the", "mean"), "se"),
        (("mean", "sd"), "sd"),
        (("mean", "low"), "mean"),
        (("low", "ci"), "lower"),
        (("crop",), ""),
    ],
)
def test_quantity_of_words(words, quantity):
    assert quantity_of(words)[0] == quantity
