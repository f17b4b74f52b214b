"""Guesses about published sheets as their teams made them.

Data: the folder `shared/data` beside the repository, whose README names sources and licences.
Expected maps: read off the sheets' headers; rural as the control is the authors' own choice.
"""

from pathlib import Path

import pandas as pd
import pytest
from sheet.guess.messy_sheets import mapping, of_file

from drystone.settings.load import settings_from
from drystone.sheet.intake import take_in

DATA = Path(__file__).resolve().parents[4] / "shared" / "data"
pytestmark = pytest.mark.skipif(not DATA.is_dir(), reason="open data folder shared/data is absent")

LETTERS = {
    f"{ours}_{what}": f"{letter}_{what}"
    for ours, letter in (("control", "C"), ("treatment", "T"))
    for what in ("mean", "sd", "n")
}
BIRDS = {
    "study": "study_ID",
    "species": "scientific_name",
    "outcome": "trait",
    "unit": "units",
    "date": "year",
    "note": "details_data_extraction",
    **{
        f"{ours}_{what}": f"{theirs}_{what}"
        for ours, theirs in (("control", "rural"), ("treatment", "urban"))
        for what in ("mean", "sd", "n")
    },
}


@pytest.mark.parametrize(
    "name",
    ["review_saltmarsh_grazing/raw_ft078.csv", "review_nutrient_heterogeneity/raw_ft144.csv"],
)
def test_sheets_with_letters_for_the_arms(name):
    proposal, _ = of_file(DATA / name)
    assert mapping(proposal) == {"row_id": "obs_ID", "study": "study_ID", **LETTERS}
    assert [item.name for item in proposal.outcomes] == ["outcome"]
    assert len(proposal.asks) == 1


@pytest.mark.parametrize("name", ["raw_database.xlsx", "raw_all_effect_sizes.csv"])
def test_urban_birds_as_workbook_and_as_csv(name):
    path = DATA / "review_urban_birds" / name
    proposal, raw = of_file(path)
    assert mapping(proposal) == BIRDS
    assert [found.theirs for found in proposal.spare] == ["rural_se", "urban_se"]
    assert {item.name: (item.unit, item.scale) for item in proposal.outcomes} == {
        "laying_date": ("days_after_JAN1", "interval"),
        "fledglings_per_attempt": ("number_of_fledglings", "ratio"),
        "clutch_size": ("number_of_eggs", "ratio"),
    }
    assert "which arm is the control" in proposal.asks[0]
    rows = take_in(raw, settings_from(proposal.settings(name))).rows
    wanted = pd.read_csv(DATA / "review_urban_birds" / "canonical_raw443.csv")
    assert len(rows) == len(wanted) == 443
    for column in ("control_mean", "treatment_mean", "control_n", "treatment_n"):
        # ALGEBRA: one number of the other file is printed with a digit less
        pd.testing.assert_series_equal(rows[column], wanted[column], rtol=1e-12)
    assert "1999_2000" in set(rows["date"])
