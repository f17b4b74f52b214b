"""Two invented extractions of the same papers: matched rows, disagreements, agreement."""

from __future__ import annotations

import math

import numpy as np
import pytest
from sheet.typed_sheets import PLAIN, settings, table

from drystone.sheet.extractions.compare import agreement, disagreements
from drystone.sheet.extractions.match import match_rows
from drystone.sheet.intake import take_in
from drystone.sheet.raw import RawSheet

STUDIES = ("Alder 2001", "Birch 2004", "Cress 2010", "Dock 1999")


def intake(*changes):
    rows = [
        {**PLAIN, "row_id": f"r{i}", "study": STUDIES[i % 4], "control_mean": 4.0 + i, **change}
        for i, change in enumerate(changes)
    ]
    return take_in(RawSheet("x.xlsx", table(rows)), settings())


def compared(first, second, tolerance=1e-6):
    pairs = match_rows(first, second)
    return disagreements(first, second, pairs, tolerance)


def test_same_sheets_agree_in_every_cell():
    one = intake({}, {}, {})
    assert compared(one, one).empty
    table = agreement(one, one, match_rows(one, one), 0.0)
    assert (table["percent"] == 100).all()
    assert set(table["column"]) == {*PLAIN} - {"row_id"}


def test_order_does_not_matter():
    one, two = intake({}, {}, {}), intake({}, {}, {})
    turned = take_in(
        RawSheet("y.xlsx", table(two.rows.loc[::-1, list(PLAIN)].to_dict("records"))), settings()
    )
    assert match_rows(one, turned) == [(0, 2), (1, 1), (2, 0)]
    assert compared(one, turned).empty


def test_rows_without_ids_are_matched_by_names_then_by_numbers():
    blank = {"row_id": None}
    one = intake({**blank, "site": "a"}, {**blank, "site": "b"}, {**blank, "site": "c"})
    two = intake({**blank, "site": "a"}, {**blank, "site": "b2"}, {**blank, "site": "c"})
    assert match_rows(one, two) == [(0, 0), (1, 1), (2, 2)]
    cells = compared(one, two)
    assert cells[["column", "a", "b"]].to_numpy().tolist() == [["site", "b", "b2"]]


def test_repeated_names_are_paired_by_their_numbers():
    same = {"row_id": None, "study": "Alder 2001"}
    one = intake({**same, "control_mean": 4.0}, {**same, "control_mean": 9.0})
    two = intake({**same, "control_mean": 9.0}, {**same, "control_mean": 4.0})
    assert match_rows(one, two) == [(0, 1), (1, 0)]


def test_rows_of_one_sheet_only_are_listed():
    one, two = intake({}, {}, {"row_id": "x"}), intake({}, {}, {}, {"row_id": "y"})
    two.rows.loc[2, "control_mean"] = 77.0
    cells = compared(intake({}, {}), intake({}, {}, {}))
    assert cells[["row", "column", "a", "b", "cell_b"]].to_numpy().tolist() == [
        ["r2", "(whole row)", "not there", "there", "comparisons, row 4"]
    ]
    assert len(match_rows(one, two)) == 3  # Cress 2010 under two names, by its numbers


def test_effect_of_each_cell_on_the_log_ratio():
    one = intake({}, {"control_mean": 2.0}, {}, {})
    two = intake(
        {"treatment_mean": 50.0}, {"control_mean": 2.2}, {"control_sd": 1.0}, {"unit": "g"}
    )
    cells = compared(one, two).set_index("row")
    # by hand: a mean ten times as large; ln 2 - ln 2.2; nothing from an SD
    assert cells.loc["r0", "log_ratio_change"] == pytest.approx(math.log(10), rel=1e-12)
    assert cells.loc["r1", "log_ratio_change"] == pytest.approx(math.log(2 / 2.2), rel=1e-12)
    assert cells.loc["r2", "log_ratio_change"] == 0
    assert np.isnan(cells.loc["r3", "log_ratio_change"])
    assert cells.loc["r1", "difference_percent"] == pytest.approx(10, rel=1e-12)
    assert list(cells.index[:2]) == ["r0", "r1"]  # the largest change stands first


def test_effect_of_a_spread_on_the_standard_error():
    one, two = intake({"control_mean": 4.0}), intake({"control_mean": 4.0, "control_sd": 1.0})
    (line,) = compared(one, two).to_dict("records")
    # by hand, first order: variance = .5^2/(4 x 4^2) + .75^2/(5 x 5^2), then SD 1 in place of .5
    before = math.sqrt(0.25 / 64 + 0.5625 / 125)
    after = math.sqrt(1 / 64 + 0.5625 / 125)
    assert line["standard_error_change"] == pytest.approx(after - before, rel=1e-12)
    assert (line["cell_a"], line["cell_b"]) == ("F2", "F2")


def test_sd_against_se_disagrees_in_the_cells_and_not_in_the_error():
    one = intake({"control_sd": None, "control_spread": 0.25, "control_spread_kind": "SE"})
    two = intake({"control_sd": None, "control_spread": 0.5, "control_spread_kind": "SD"})
    cells = compared(one, two).set_index("column")
    assert set(cells.index) == {"control_spread", "control_spread_kind"}
    # SE .25 with n 4 is SD .5
    assert cells["standard_error_change"].abs().max() < 1e-15


@pytest.mark.parametrize(("tolerance", "count"), [(0.0, 1), (0.004, 1), (0.006, 0)])
def test_tolerance_is_relative(tolerance, count):
    one, two = intake({"control_mean": 200.0}), intake({"control_mean": 201.0})
    assert len(compared(one, two, tolerance)) == count


def test_blank_against_filled_disagrees_and_case_does_not():
    one = intake({"site": "North"}, {"control_sd": None, "site": "x"})
    two = intake({"site": " north"}, {"site": "x"})
    cells = compared(one, two)
    assert cells[["row", "column", "a", "b"]].to_numpy().tolist() == [
        ["r1", "control_sd", "", "0.5"]
    ]


def test_agreement_by_column_and_kappa_of_categories():
    kinds = [("oat", "oat")] * 3 + [("oat", "rye")] + [("rye", "rye")] * 4
    one = intake(*({"crop": a} for a, _ in kinds))
    two = intake(*({"crop": b} for _, b in kinds))
    table = agreement(one, two, match_rows(one, two), 0.0).set_index("column")
    assert list(table.loc["crop", ["compared", "agreeing", "percent"]]) == [8, 7, 87.5]
    # by hand: observed 7/8; by chance (4 x 3 + 4 x 5)/64 = 1/2; (7/8 - 1/2)/(1/2) = .75
    assert table.loc["crop", "kappa"] == pytest.approx(0.75, rel=1e-12)
    assert np.isnan(table.loc["control_mean", "kappa"])
