"""Figures for papers: data of the specification, files, names that try to break out."""

from __future__ import annotations

import json
from pathlib import Path
from xml.etree import ElementTree

import pytest
from report.invented_facts import HOSTILE, invented_facts

from drystone.report.facts import main_strategy
from drystone.report.figures import figure_specs, save_figures


def test_each_analysis_has_its_figures() -> None:
    names = set(figure_specs(invented_facts(12)))
    for analysis in ("beetles", "seeds"):
        for kind in ("strategies", "studies", "rows", "gaps"):
            assert f"{analysis} {kind}" in names
    assert not any(name.endswith(" rows") for name in figure_specs(invented_facts(130)))


def test_figure_of_rows_shows_the_rows_of_the_main_strategy() -> None:
    facts = invented_facts(12)
    values = figure_specs(facts)["beetles rows"]["data"]["values"]
    sampling = main_strategy(facts, facts.analyses[0]).sampling
    assert sorted(value["estimate"] for value in values) == sorted(sampling["effect"])


def test_bars_of_studies_and_rows_say_how_far_they_reach() -> None:
    specs = figure_specs(invented_facts(12))
    for kind in ("studies", "rows"):
        assert "bar: 1.96 SE" in specs[f"beetles {kind}"]["title"]  # normal quantile at 0.975


def test_specifications_are_plain_and_fetch_nothing() -> None:
    for spec in figure_specs(invented_facts(40, hostile=True)).values():
        text = json.dumps(spec, allow_nan=False)
        assert '"url"' not in text
        assert "signal" not in text


def test_a_refused_strategy_has_no_bar() -> None:
    specs = figure_specs(invented_facts(12, refuse_main=True))
    values = specs["beetles strategies"]["data"]["values"]
    assert [value["label"].split(",")[0] for value in values] == [
        "complete cases",
        "missing cases",
        "all cases on complete rows",
    ]


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    target = tmp_path_factory.mktemp("figures") / "new"
    save_figures(invented_facts(12, hostile=True, analyses=1), target)
    return target


def test_files_are_what_their_endings_say(folder: Path) -> None:
    assert len(list(folder.iterdir())) == 3 * 5
    assert all(p.read_bytes().startswith(b"%PDF-") for p in folder.glob("*.pdf"))
    assert all(p.read_bytes().startswith(b"\x89PNG") for p in folder.glob("*.png"))


def test_hostile_names_stay_text_in_the_picture(folder: Path) -> None:
    root = ElementTree.fromstring((folder / "beetles studies.svg").read_text("utf-8"))
    tags = {element.tag.rsplit("}", 1)[-1] for element in root.iter()}
    assert not {"script", "image", "foreignObject", "a"} & tags
    text = " ".join(root.itertext())
    assert HOSTILE[0] in text
