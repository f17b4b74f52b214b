"""The demo's workbook is what the script makes, fits its config, and says that it is invented."""

from collections import Counter, defaultdict
from itertools import chain

import demo_places as places
import make_demo
import openpyxl
import pandas as pd
import pytest

from drystone.settings.formulas import columns_of
from drystone.settings.load import load_settings
from drystone.tables import comparisons, studies
from drystone.tables.store import conform


@pytest.fixture(scope="module")
def book(root):
    return openpyxl.load_workbook(root / "data_template" / "demo" / "extraction.xlsx")


def rows_in(sheet):
    header, *rows = sheet.iter_rows(values_only=True)
    return [dict(zip(header, row, strict=True)) for row in rows]


@pytest.fixture(scope="module")
def rows(book):
    return rows_in(book["comparisons"])


@pytest.fixture(scope="module")
def sources(book):
    return rows_in(book["studies"])


def has_spread(row, arm):
    return any(row[f"{arm}_{cell}"] is not None for cell in ("sd", "spread", "lower"))


def contents(path):
    book = openpyxl.load_workbook(path)
    return {
        (sheet.title, cell.coordinate): (cell.value, cell.comment and cell.comment.text)
        for sheet in book
        for cell in chain.from_iterable(sheet.iter_rows())
    }


def test_repository_holds_what_the_script_makes(root, tmp_path):
    make_demo.write_demo(tmp_path)
    kept = root / "data_template" / "demo"
    assert contents(tmp_path / "extraction.xlsx") == contents(kept / "extraction.xlsx")
    assert (tmp_path / "README.md").read_text() == (kept / "README.md").read_text()


def test_second_run_writes_the_same_bytes(tmp_path):
    for name in ("first", "second"):
        make_demo.write_demo(tmp_path / name)
    first, second = (tmp_path / name / "extraction.xlsx" for name in ("first", "second"))
    assert first.read_bytes() == second.read_bytes()


def test_everything_people_see_says_invented(root, book, sources):
    folder = root / "data_template" / "demo"
    assert "INVENTED" in (folder / "README.md").read_text()
    assert "INVENTED" in (folder / "config.yaml").read_text()
    assert book.sheetnames[0] == "about"
    assert "INVENTED" in book["about"]["A2"].value
    assert "INVENTED" in book.properties.description
    assert all(source["citation"].startswith("Invented record") for source in sources)


def test_size_is_that_of_a_real_review(rows, sources):
    assert len(rows) >= 120
    assert len(sources) >= 35
    assert {row["study"] for row in rows} == {source["study"] for source in sources}
    assert set(Counter(row["outcome"] for row in rows)) == set(places.OUTCOMES)
    assert len({row["species"] for row in rows}) == 8


def test_ids_are_unique(rows, sources):
    assert len({row["row_id"] for row in rows}) == len(rows)
    assert len({(row["study"], row["treatment_id"]) for row in rows}) == len(rows)
    assert len({source["study"] for source in sources}) == len(sources)


def test_shared_controls_have_the_same_numbers_in_every_row(rows):
    arms = defaultdict(list)
    for row in rows:
        cells = tuple(value for name, value in row.items() if name.startswith("control_"))
        arms[row["study"], row["control_id"]].append((row["outcome"], row["species"], *cells))
    assert all(len(set(seen)) == 1 for seen in arms.values())
    shared = sum(len(seen) > 1 for seen in arms.values()) / len(arms)
    assert 0.35 < shared < 0.45  # about 4 in 10


def test_a_quarter_of_spreads_is_missing_and_more_in_small_studies(rows):
    missing = [
        (row["control_n"], not has_spread(row, arm))
        for row in rows
        if row["control_n"] is not None
        for arm in ("control", "treatment")
    ]
    small = [gone for n, gone in missing if n <= 5]
    large = [gone for n, gone in missing if n >= 9]
    assert 0.2 < sum(gone for _, gone in missing) / len(missing) < 0.3
    assert sum(small) / len(small) > 1.5 * sum(large) / len(large)


def test_several_kinds_of_spread_are_typed(rows):
    kinds = {row["control_spread_kind"] for row in rows} - {None}
    assert kinds == {"SE", "CI", "CV%", "variance"}
    for row in rows:
        limits = row["control_lower"] is not None and row["control_upper"] is not None
        assert limits == (row["control_spread_kind"] == "CI")


def test_planted_flaws_are_five_and_listed_in_the_readme(root, rows, sources):
    page = (root / "data_template" / "demo" / "README.md").read_text()
    excluded = [row for row in rows if row["exclude_reason"]]
    zero_mean = [row for row in rows if row["treatment_mean"] == 0 or row["control_mean"] == 0]
    without_n = [row for row in rows if row["control_n"] is None or row["treatment_n"] is None]
    zero_sd = [row for row in rows if row["treatment_sd"] == 0 or row["control_sd"] == 0]
    assert [len(found) for found in (excluded, zero_mean, without_n, zero_sd)] == [2, 1, 1, 1]
    flawed = [row["row_id"] for row in (*excluded, *zero_mean, *without_n, *zero_sd)]
    assert len(set(flawed)) == 5
    assert all(f"| {row_id} |" in page for row_id in flawed)
    assert [source["study"] for source in sources if source["status"] != "in"] == [
        make_demo.PENDING
    ]


def test_cells_fit_the_schemas(rows, sources):
    comparison_table = pd.DataFrame(rows, columns=list(comparisons.COLUMNS), dtype=object)
    study_table = pd.DataFrame(sources, columns=list(studies.COLUMNS), dtype=object)
    assert len(conform(comparison_table, comparisons.SCHEMA)) == len(rows)
    assert len(conform(study_table, studies.SCHEMA)) == len(sources)


def test_config_of_the_repository_is_the_config_of_the_demo(root):
    kept = (root / "config" / "config.yaml").read_text()
    assert kept == (root / "data_template" / "demo" / "config.yaml").read_text()


def test_config_fits_the_sheet(root, rows):
    settings = load_settings(root / "data_template" / "demo" / "config.yaml")
    units = {row["outcome"]: row["unit"] for row in rows}
    assert {name: item.unit for name, item in settings.outcomes.items()} == units
    assert {row["unit"] for row in rows} == set(units.values())
    formulas = [
        text for analysis in settings.analyses.values() for text in analysis.models.values()
    ]
    assert {name for text in formulas for name in columns_of(text)} == {"wall_height_m", "aspect"}
    assert set(make_demo.MODERATORS) <= set(rows[0])
    assert len(settings.strategies) == 3
    assert settings.primary == "all cases"
