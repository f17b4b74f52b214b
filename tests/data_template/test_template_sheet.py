"""The empty workbook and the column guide follow the schemas."""

import make_template
import openpyxl
import pytest
import workbook_look as look
from openpyxl.utils import get_column_letter

from drystone.settings.load import load_settings
from drystone.tables import columns, comparisons, studies

TABLES = {"comparisons": comparisons.COLUMNS, "studies": studies.COLUMNS}


@pytest.fixture(scope="module", params=["kept", "made now"])
def book(request, root, tmp_path_factory):
    """Return the repository's workbook, and the one that the script writes now."""
    folder = root / "data_template"
    if request.param == "made now":
        folder = tmp_path_factory.mktemp("template")
        make_template.write_template(folder)
    return openpyxl.load_workbook(folder / "extraction.xlsx")


def test_template_has_three_sheets_and_no_row(book):
    assert book.sheetnames == ["comparisons", "studies", "help"]
    assert book["comparisons"].max_row == book["studies"].max_row == 1


@pytest.mark.parametrize("name", TABLES)
def test_header_is_the_schema_with_description_unit_and_values(book, name):
    cells = {cell.value: cell for cell in book[name][1]}
    assert list(cells) == list(TABLES[name])
    for column_name, column in TABLES[name].items():
        comment = cells[column_name].comment.text
        assert column.description in comment
        assert column.metadata.get("unit", "") in comment
        assert all(value in comment for value in column.metadata.get("allowed", ()))
        assert ("Required" in comment) == (not column.nullable)


@pytest.mark.parametrize("name", TABLES)
def test_pick_lists_are_the_allowed_values(book, name):
    found = {}
    for rule in book[name].data_validations.dataValidation:
        [area] = rule.sqref.ranges
        assert (area.min_row, area.min_col) == (2, area.max_col)
        found[area.min_col] = rule.formula1.strip('"').split(",")
    expected = {
        index: column.metadata["allowed"]
        for index, column in enumerate(TABLES[name].values(), start=1)
        if column.metadata.get("allowed")
    }
    assert found == expected


def test_first_twenty_columns_are_open_and_the_others_folded(book):
    sheet = book["comparisons"]
    hidden = [
        sheet.column_dimensions[get_column_letter(index)].hidden
        for index in range(1, len(comparisons.COLUMNS) + 1)
    ]
    assert hidden == [False] * 20 + [True] * (len(hidden) - 20)


def test_each_folded_group_has_a_button_of_its_own(book):
    sheet = book["comparisons"]
    levels = {}
    for index, (name, column) in enumerate(comparisons.COLUMNS.items(), start=1):
        if name not in comparisons.OPEN_COLUMNS:
            level = sheet.column_dimensions[get_column_letter(index)].outlineLevel
            levels.setdefault(column.metadata["group"], []).append(level)
    assert len(levels) == 5
    for group in levels.values():
        assert group == [1] + [2] * (len(group) - 1)
    assert sheet.sheet_properties.outlinePr.summaryRight is False


def test_header_and_names_stay_in_view(book):
    assert book["comparisons"].freeze_panes == "C2"
    assert book["studies"].freeze_panes == "B2"


def test_help_lists_every_column(book):
    lines = [row for row in book["help"].iter_rows(values_only=True) if row[0] in TABLES]
    expected = [
        (
            sheet,
            name,
            column.description,
            column.metadata.get("unit") or None,
            "; ".join(column.metadata.get("allowed", ())) or None,
            None if column.nullable else "yes",
        )
        for sheet, table in TABLES.items()
        for name, column in table.items()
    ]
    assert [(line[0], line[1], *line[3:7]) for line in lines] == expected


def test_column_guide_is_up_to_date(root):
    kept = (root / "data_template" / "columns.md").read_text()
    assert kept == make_template.column_guide()
    for table in TABLES.values():
        assert all(f"| `{name}`" in kept for name in table)


def test_workbook_is_up_to_date_and_its_bytes_are_stable(root, tmp_path):
    for name in ("first", "second"):
        make_template.write_template(tmp_path / name)
    first, second = (tmp_path / name / "extraction.xlsx" for name in ("first", "second"))
    assert first.read_bytes() == second.read_bytes()
    kept, made = (
        [list(sheet.values) for sheet in openpyxl.load_workbook(path)]
        for path in (root / "data_template" / "extraction.xlsx", first)
    )
    assert kept == made


def test_value_with_a_comma_is_refused_as_pick_list():
    book = look.new_workbook("title", "description")
    table = {"kind": columns.text("a kind", allowed=("one, two", "three"))}
    with pytest.raises(ValueError, match="pick-list"):
        look.add_table(book, "kinds", table)


def test_config_of_a_new_review_loads_and_asks_for_little(root):
    settings = load_settings(root / "data_template" / "config.yaml")
    assert settings.sheet == "data/extraction.xlsx"
    assert settings.model_fields_set == {"sheet", "outcomes", "primary"}
    assert list(settings.all_analyses()) == ["name of the outcome"]


def test_commented_part_of_the_config_loads_too(root, tmp_path):
    text = (root / "data_template" / "config.yaml").read_text()
    head, tail = text.split("# analyses:\n")
    block, rest = tail.split("\n\n", 1)
    opened = "\n".join(line.removeprefix("# ") for line in block.splitlines())
    path = tmp_path / "config.yaml"
    path.write_text(f"{head}analyses:\n{opened}\n\n{rest}")
    assert load_settings(path).analyses["main"].models == {
        "overall": "~ 1",
        "my moderator": "~ my_column",
    }
