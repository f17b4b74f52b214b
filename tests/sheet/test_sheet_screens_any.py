"""Findings that compare rows: no content makes them fail, and order of rows does not matter."""

from hypothesis import given
from hypothesis import settings as trial
from hypothesis import strategies as st
from sheet.typed_sheets import balances, settings, table

from drystone.sheet.intake import take_in
from drystone.sheet.present import collapse
from drystone.sheet.raw import RawSheet
from drystone.tables.check import FINDINGS
from drystone.tables.store import conform

# Few different values, so that rows often share arms; and values at the ends of what floats hold.
means = st.sampled_from([4.37, 5.21, 12.0, 0.0, -1.0, 5e-324, 1e-308, 1e308, 315.0, ""])
sds = st.sampled_from([0.5, 0.51, 0.0, 5e-324, 1e308, 1e-300, 40.0, ""])
counts = st.sampled_from([1.0, 2.0, 2.5, 4.0, 40.0, 43588.0, 1e300, "3-5", "", 1.0000000001])
names = st.sampled_from(["a", "b", "open", ""])
rows = st.fixed_dictionaries(
    {
        "study": st.sampled_from(["A", "B", "C", "D", "E", "F", "G", ""]),
        "outcome": st.sampled_from(["yield", "cover", "eggs", "soil pH", "pest loss"]),
        "unit": st.sampled_from(["%", "proportion", "number of eggs", "t/ha", ""]),
        "date": names,
        "control_label": names,
        "treatment_label": names,
        **{
            f"{arm}_{what}": values
            for arm in ("control", "treatment")
            for what, values in (("mean", means), ("sd", sds), ("n", counts), ("id", names))
        },
        "control_spread": sds,
        "control_spread_kind": st.sampled_from(["SE", "SD", ""]),
        "control_n_meaning": st.sampled_from(["individual", ""]),
        "total_n": counts,
    }
)
OUTCOMES = {"yield": None, "cover": None, "eggs": {"scale": "count"}, "soil pH": None}


def findings_of(made):
    named = [{**row, "row_id": f"r{i}"} for i, row in enumerate(made)]
    config = settings(outcomes={**OUTCOMES, "pest loss": {"scale": "ratio"}})
    return take_in(RawSheet("x.xlsx", table(named)), config)


@trial(max_examples=60, deadline=None)
@given(st.lists(rows, min_size=10, max_size=40))
def test_no_content_makes_the_comparisons_fail(made):
    intake = findings_of(made)
    assert balances(intake)
    conform(intake.findings, FINDINGS)
    for line in collapse(intake.findings):
        assert str(line)


@trial(max_examples=20, deadline=None)
@given(st.lists(rows, min_size=10, max_size=25))
def test_spreads_and_ratios_are_judged_the_same_in_any_order(made):
    judged = {"SE taken for SD", "SD taken for SE", "CV far out", "ratio far out"}

    def said(order, names):
        found = findings_of(order).findings
        at = found[found["rule"].isin(judged)]
        places = {name: i for i, name in names.items()}
        return sorted((places[r.row_id], r.rule, r.column) for r in at.itertuples())

    forth = {i: f"r{i}" for i in range(len(made))}
    back = {len(made) - 1 - i: f"r{i}" for i in range(len(made))}
    assert said(made, forth) == said(made[::-1], back)
