"""The generated description of the config is up to date and agrees with the models."""

import difflib
from pathlib import Path

import pytest
from jsonschema import Draft202012Validator

from drystone.settings import describe
from drystone.settings.load import ConfigProblem, settings_from
from drystone.settings.model import Analysis, Inference, Outcome, Settings, Strategy
from drystone.settings.strict_yaml import load_strict

ROOT = Path(__file__).resolve().parents[2]
VALID = Draft202012Validator(describe.json_schema())
SMALL = {"sheet": "a.xlsx", "outcomes": {"yield": {"unit": "t/ha"}}}


@pytest.mark.parametrize("name", list(describe.generated_files()))
def test_generated_file_is_up_to_date(name):
    made = describe.generated_files()[name]
    kept = (ROOT / name).read_text(encoding="utf-8")
    diff = "\n".join(difflib.unified_diff(kept.splitlines(), made.splitlines(), name, "models"))
    assert kept == made, f"{diff}\nrewrite with: {describe.REWRITE}"


def test_write_makes_both_files(tmp_path):
    (tmp_path / "config").mkdir()
    assert describe.main(["--write", str(tmp_path)]) == 0
    for name, text in describe.generated_files().items():
        assert (tmp_path / name).read_text(encoding="utf-8") == text


def test_write_refuses_a_folder_that_is_no_repository(tmp_path, capsys):
    with pytest.raises(SystemExit) as refused:
        describe.main(["--write", str(tmp_path)])
    assert refused.value.code == 2
    assert "no folder config" in capsys.readouterr().err
    assert list(tmp_path.iterdir()) == []


def test_without_write_the_table_is_shown(capsys):
    assert describe.main([]) == 0
    assert capsys.readouterr().out == describe.option_table()


@pytest.mark.parametrize(
    ("model", "prefix"),
    [
        (Settings, ""),
        (Outcome, "outcomes: NAME: "),
        (Analysis, "analyses: NAME: "),
        (Strategy, "strategies: - "),
        (Inference, "inference: "),
    ],
)
def test_table_names_every_option(model, prefix):
    rows = describe.option_table().splitlines()
    for name, field in model.model_fields.items():
        [row] = [row for row in rows if row.startswith(f"| `{prefix}{name}` |")]
        assert field.description in row


def test_table_shows_values_bounds_and_defaults():
    table = describe.option_table()
    assert "| `missing_n` | `leave`, `study minimum`, `outcome median` | `leave` |" in table
    assert "| `inference: confidence_percent` | number above 50 below 100 | `95` |" in table
    assert "| `sheet` | text | required |" in table
    assert '| `analyses: NAME: models` | name: text | `overall: "~ 1"` |' in table


@pytest.mark.parametrize("name", ["config/config.yaml", "data_template/config.yaml"])
def test_schema_accepts_the_configs_of_the_repository(name):
    VALID.validate(load_strict(ROOT / name).content)


@pytest.mark.parametrize(
    "more",
    [
        {},
        {"outcomes": {"yield": None}},
        {"analyses": {"main": {"outcome": "yield"}}},
        {"analyses": {"main": {"outcome": ["yield"], "levels": "study"}}},
        {"analyses": {"main": {"outcome": "yield", "where": {"year": 2009, "site": ["N", "S"]}}}},
        {"strategies": ["complete cases", {"all cases": {"average_cv": "mean of squares"}}]},
        {"strategies": [{"all cases": None}]},
        {"strategies": [{"name": "pooled", "use": "all cases", "average_over": "both arms"}]},
        {"inference": {"confidence_percent": 90}},
        {"columns": {"control_mean": "ctl"}, "zero_sd": "as typed"},
    ],
)
def test_schema_and_models_accept_the_same(more):
    config = {**SMALL, **more}
    settings_from(config)
    VALID.validate(config)


@pytest.mark.parametrize(
    "more",
    [
        {"outcome": {}},
        {"outcomes": {}},
        {"outcomes": {"yield": {"scale": "log"}}},
        {"sheet": 3},
        {"analyses": {"main": {}}},
        {"analyses": {"main": {"outcome": "yield", "levels": ["site"]}}},
        {"analyses": {"main": {"outcome": "yield", "where": {"year": True}}}},
        {"strategies": []},
        {"strategies": ["no cases"]},
        {"strategies": [{"all cases": {"average": "x"}}]},
        {"strategies": [{"name": "pooled"}]},
        {"inference": {"confidence_percent": 100}},
        {"inference": {"confidence_percent": "95"}},
        {"missing_n": "guess"},
    ],
)
def test_schema_and_models_refuse_the_same(more):
    config = {**SMALL, **more}
    with pytest.raises(ConfigProblem):
        settings_from(config)
    assert not VALID.is_valid(config)
