"""Config faults name the place and the nearest known word."""

from __future__ import annotations

import pytest

from drystone.settings.load import parse_settings
from drystone.settings.problems import ConfigProblem

LEAST = "sheet: data/s.xlsx\noutcomes: {yield: {unit: t/ha}}\n"


def test_least_config_gives_one_analysis_and_every_strategy():
    settings = parse_settings(LEAST)
    assert list(settings.all_analyses()) == ["yield"]
    assert settings.all_analyses()["yield"].models == {"overall": "~ 1"}
    assert list(settings.all_strategies()) == [
        "complete cases",
        "missing cases",
        "all cases",
        "all cases on complete rows",
    ]


def test_the_same_strategy_twice_under_two_names():
    text = (
        LEAST
        + "strategies:\n- all cases\n- {name: pooled, use: all cases, average_over: both arms}"
    )
    found = parse_settings(text).all_strategies()
    assert found["pooled"].average_over == "both arms"
    assert found["pooled on complete rows"].rows == "complete"


def test_outcomes_of_other_scales_get_no_analysis_of_their_own():
    settings = parse_settings("sheet: s\noutcomes: {a: {}, b: {scale: interval}}")
    assert list(settings.all_analyses()) == ["a"]


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "must hold keys"),
        ("- a", "must hold keys"),
        ("sheet: s", "outcomes: is required and absent"),
        (
            LEAST + "strategys: [all cases]",
            "line 3: strategys: unknown key; did you mean 'strategies'",
        ),
        ("sheet: s\noutcomes: {y: {unitt: x}}", "did you mean 'unit'"),
        ("sheet: s\noutcomes: {}", "needs at least one outcome"),
        ("sheet: 3\noutcomes: {y: }", "sheet: must be text (it is 3)"),
        (LEAST + "analyses: {a: {outcome: yeild}}", "did you mean 'yield'"),
        (LEAST + "analyses: {a/b: {outcome: yield}}", "cannot be a folder's name"),
        (LEAST + "analyses: {findings.csv: {outcome: yield}}", "ends like a file"),
        (LEAST + "inference: {confidence_percent: " + "9" * 5000 + "}", "too many digits"),
        (LEAST + "outcomes2: {}", "unknown key"),
        ("sheet: s\noutcomes: {y: {flip_sign: no}}", "must be true or false (it is 'no')"),
        ("sheet:\noutcomes: {y: }", "sheet: must be text, and it is empty"),
        (LEAST + "analyses: {con: {outcome: yield}}", "reserved"),
        (LEAST + "analyses: {..: {outcome: yield}}", "cannot be a folder's name"),
        (LEAST + "analyses: {A: {outcome: yield}, a: {outcome: yield}}", "would share a folder"),
        (LEAST + "analyses: {a: {outcome: yield, levels: [study, study]}}", "names a level twice"),
        (LEAST + "analyses: {a: {outcome: []}}", "at least one outcome"),
        (LEAST + "analyses: {a: {outcome: yield, models: {}}}", "at least one model"),
        (LEAST + "analyses: {a: {outcome: yield, models: {m: '1'}}}", "must begin with ~"),
        (
            LEAST + "analyses: {a: {outcome: yield, models: {m: '~ exp(x)'}}}",
            "exp() is not allowed",
        ),
        (LEAST + "strategies: [every case]", "strategies: item 1: use"),
        (LEAST + "strategies: []", "name at least one"),
        (LEAST + "strategies: [all cases, all cases]", "would share a folder"),
        (LEAST + "strategies: [{all cases: {name: other}}]", "a name of its own"),
        (LEAST + "primary: hybrid", "primary 'hybrid'"),
        (LEAST + "inference: {confidence_percent: 100}", "less than 100"),
        (LEAST + "inference: {confidence_percent: yes}", "it is 'yes'"),
        ("sheet: s\noutcomes: {a: {scale: interval}}", "no outcome has a ratio scale"),
        (LEAST + "defaults: {design: crossed}", "'crossed'"),
    ],
)
def test_faults_are_named(text, said):
    with pytest.raises(ConfigProblem) as caught:
        parse_settings(text)
    assert said in str(caught.value)


def test_primary_falls_back_to_the_first_declared_strategy():
    assert parse_settings(LEAST + "strategies: [missing cases]").primary == "missing cases"
