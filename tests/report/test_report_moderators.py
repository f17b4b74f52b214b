"""What coefficients stand for: intercepts, means of groups, differences, slopes."""

from __future__ import annotations

import math
from dataclasses import replace

import pandas as pd
import pytest
from report.invented_facts import invented_facts
from test_report_numbers import plain

from drystone.report import moderators, terms
from drystone.report.facts import AnalysisFacts, ReportFacts
from drystone.stages.design_matrix import design_matrix

# invented rows; one is blank in `soil` and holds the first soil in the alphabet
ROWS = pd.DataFrame(
    {
        "row_id": list("abcdefg"),
        "aspect": ["south", "north", "east", "east", "north", "south", "east"],
        "soil type": ["loam", "peat", "peat", "loam", "peat", "loam", "peat"],
        "soil": ["marl", "peat", "peat", "loam", "peat", "loam", None],
        "height": [1.2, 2.0, 3.0, 4.0, 5.0, 2.0, 1.0],
        "year": [2001.0, 2002.0, 2001.0, 2003.0, 2002.0, 2001.0, 2003.0],
    }
)
AT_ZERO = "height = 0 (outside the data, 1.00 to 5.00)"


@pytest.mark.parametrize(
    ("formula", "expected"),
    [
        ("~ aspect", ["mean at aspect = east", "north against east", "south against east"]),
        ("~ aspect - 1", ["mean of east", "mean of north", "mean of south"]),
        (
            "~ aspect + `soil type` - 1",
            [
                "mean of east at soil type = loam",
                "mean of north at soil type = loam",
                "mean of south at soil type = loam",
                "peat against loam",
            ],
        ),
        ("~ height", [f"mean at {AT_ZERO}", "slope per unit of height"]),
        (
            "~ log(height)",
            ["mean at height = 1", "slope per unit of log height (as it grows 2.72 times)"],
        ),
        ("~ center(height)", ["mean at the mean of height", "slope per unit of height"]),
        ("~ scale(height)", ["mean at the mean of height", "slope per SD of height"]),
        (
            "~ C(year)",
            ["mean at year = 2001.0", "2002.0 against 2001.0", "2003.0 against 2001.0"],
        ),
        (
            "~ `soil type` * height",
            [
                f"mean at soil type = loam and {AT_ZERO}",
                "peat against loam",
                "slope per unit of height",
                terms.INTERACTION,
            ],
        ),
        (
            "~ `soil type`:height - 1",
            ["mean or slope of this combination", "mean or slope of this combination"],
        ),
        ("~ soil", ["mean at soil = loam", "marl against loam", "peat against loam"]),
    ],
)
def test_meaning_of_every_coefficient(formula: str, expected: list[str]) -> None:
    names = design_matrix(formula, ROWS).names
    known = terms.moderators(formula, names, ROWS)
    assert [plain(terms.meaning(name, known, names)) for name in names] == expected


def test_reference_is_taken_among_the_rows_of_the_fit() -> None:
    names = ("intercept", "soil = peat")
    few = ROWS[ROWS["soil"] != "loam"]
    assert terms.references(terms.moderators("~ soil", names, few)) == "Reference: soil = marl."
    assert terms.references(terms.moderators("~ aspect - 1", ("aspect = east",), ROWS[2:3])) == ""


def tables(facts: ReportFacts, analysis: AnalysisFacts) -> list:
    main = analysis.strategy("all cases")
    assert main is not None
    return list(moderators.moderator_tables(facts, analysis, main))


def texts(table) -> list[list[str]]:
    return [[plain(cell.text) for cell in row.cells] for row in table.rows]


def with_coefficients(analysis: AnalysisFacts, **changes: object) -> AnalysisFacts:
    """Analysis with columns of the first coefficient of every model with moderators replaced."""

    def changed(model):
        if model.is_overall or model.refused:
            return model
        table = model.coefficients.copy()
        for name, value in changes.items():
            table.loc[0, name] = value
        return replace(model, coefficients=table)

    made = (replace(s, models=tuple(map(changed, s.models))) for s in analysis.strategies)
    return replace(analysis, strategies=tuple(made))


def test_captions_name_the_reference_and_how_to_read() -> None:
    facts = invented_facts(130)
    first, second = tables(facts, facts.analyses[0])
    assert "Reference: path = bark." in first.caption
    assert moderators.HOW_TO_READ in first.caption
    assert "df" not in first.caption
    assert [row[1] for row in texts(second)][1:3] == ["gravel against bark", "sand against bark"]
    assert [row[2] for row in texts(second)] == ["refused"] * 4  # under complete cases


def test_an_interaction_says_where_its_main_terms_hold() -> None:
    facts = invented_facts(130)
    analysis = facts.analyses[0]
    assert moderators.WITH_INTERACTION not in tables(facts, analysis)[0].caption
    main = analysis.strategy("all cases")
    assert main is not None
    model = main.models[1]
    table = pd.concat([model.coefficients, model.coefficients.tail(1)], ignore_index=True)
    table.loc[len(table) - 1, "coefficient"] = "path = sand x age"
    crossed = replace(main, models=(replace(model, formula="~ path * age", coefficients=table),))
    first = next(moderators.moderator_tables(facts, analysis, crossed))
    assert moderators.WITH_INTERACTION in first.caption
    assert texts(first)[-1][1] == terms.INTERACTION


def test_few_degrees_of_freedom_are_marked_in_the_table() -> None:
    facts = invented_facts(130)
    first = tables(facts, with_coefficients(facts.analyses[0], df=2.5))[0]
    place = first.heads.index("df")
    assert texts(first)[0][place] == "2.50 (below 4)"
    assert "below 4" not in texts(first)[1][place]
    assert "too few studies" in first.caption


def test_absurd_percents_give_way_to_the_log_scale() -> None:
    facts = invented_facts(130)
    wild = with_coefficients(facts.analyses[0], estimate=-11.5, ci_low=-30.2, ci_high=17.1)
    first, second = tables(facts, wild)
    assert texts(first)[0][2] == "beyond a factor of 1 000"
    assert texts(second)[0][3] == "beyond a factor of 1 000; log scale -11.5 (-30.2 to 17.1)"


def test_the_limit_of_absurd_is_a_factor_of_a_thousand() -> None:
    inside, outside = math.log(999.0), math.log(1001.0)
    assert "%" in moderators.as_percent(0.0, -0.1, inside)
    assert moderators.as_percent(0.0, -outside, 0.1) == moderators.BEYOND


def test_a_strategy_with_another_reference_says_so() -> None:
    facts = invented_facts(130)
    analysis = facts.analyses[0]
    place = next(i for i, s in enumerate(analysis.strategies) if s.name == "missing cases")
    item = analysis.strategies[place]
    bark = set(analysis.slice.loc[analysis.slice["path"] == "bark", "row_id"])
    model = item.models[1]
    fewer = model.coefficients[model.coefficients["coefficient"] != "path = gravel"]
    other = replace(
        item,
        sampling=item.sampling[~item.sampling["row_id"].isin(bark)],
        models=(item.models[0], replace(model, coefficients=fewer)),
    )
    made = (*analysis.strategies[:place], other, *analysis.strategies[place + 1 :])
    second = tables(facts, replace(analysis, strategies=made))[1]
    sand = next(row for row in texts(second) if row[0] == "path = sand")
    assert sand[1] == "sand against bark"
    assert sand[2 + place].endswith("; here: sand against gravel")
    gravel = next(row for row in texts(second) if row[0] == "path = gravel")
    assert gravel[2 + place] == ""


def test_a_model_refused_under_the_main_strategy_is_still_shown_for_the_others() -> None:
    facts = invented_facts(130, refuse_main=True)
    [across] = tables(facts, facts.analyses[0])
    assert "over the strategies" in across.caption
    assert {row[4] for row in texts(across)} == {"refused"}
    assert all("%" in row[3] for row in texts(across))
