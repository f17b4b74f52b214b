"""Several header lines, padding, codebooks, code pages, commas; every sheet is invented."""

import openpyxl
import pytest
from sheet.guess.messy_sheets import ARM_COLUMNS, NUMBERS, STUDIES, guess, mapping, of_file, write
from sheet.typed_sheets import balances, save_xlsx

from drystone.settings.load import parse_settings, settings_from
from drystone.sheet.guess.config_text import config_text
from drystone.sheet.guess.proposal import propose
from drystone.sheet.guess.screen import WIDTH, finding_lines, guess_lines
from drystone.sheet.intake import take_in
from drystone.sheet.laid_out import join_lines
from drystone.sheet.present import Line
from drystone.sheet.sources import Source, raw_sheet, read_sources

FLAT = ["study", "C_mean", "C_sd", "C_n", "T_mean", "T_sd", "T_n"]
THREE = ["mean", "SD", "n"]


def taken(path):
    """Proposal and intake of a file, through the config that is proposed for it."""
    proposal, raw = of_file(path)
    return proposal, take_in(raw, settings_from(proposal.settings(path.name)))


def arm_numbers(intake):
    return [tuple(row) for row in intake.rows[list(ARM_COLUMNS)].itertuples(index=False)]


EXPECTED = [tuple(map(float, row[1:])) for row in NUMBERS]


def test_merged_header_cells_in_two_lines_below_a_title(tmp_path):
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.append(["Table S2. Invented extraction sheet"])
    sheet.append([])
    sheet.append(["Study", "Control", None, None, "Treatment", None, None, "Crop"])
    sheet.append([None, *THREE, *THREE, None])
    for row in NUMBERS:
        sheet.append([*row, "oat"])
    sheet.merge_cells("B3:D3")
    sheet.merge_cells("E3:G3")
    sheet.merge_cells("A3:A4")
    path = tmp_path / "merged.xlsx"
    book.save(path)
    proposal, intake = taken(path)
    assert (proposal.layout.header_row, proposal.layout.header_rows) == (3, 2)
    assert mapping(proposal)["control_sd"] == "Control SD"
    assert proposal.moderators == ("Crop",)
    assert arm_numbers(intake) == EXPECTED
    assert intake.columns["treatment_mean"] == ("E", "Treatment mean")


def test_units_in_a_line_below_the_headers_belong_to_the_headers(tmp_path):
    units = [None, "t/ha", "t/ha", "plots", "t/ha", "t/ha", "plots"]
    path = write(tmp_path / "units.csv", [FLAT, units, *NUMBERS])
    proposal, intake = taken(path)
    assert proposal.layout.header_rows == 2
    assert arm_numbers(intake) == EXPECTED


def test_text_rows_without_numbers_are_no_header_lines(tmp_path):
    empty = [(f"Sedge {year}", *[""] * 6) for year in range(1990, 1998)]
    proposal, intake = taken(write(tmp_path / "a.csv", [FLAT, *empty, *NUMBERS]))
    assert proposal.layout.header_rows == 1
    assert len(intake.rows) == 12


def test_group_names_are_carried_over_their_columns_only():
    lines = [
        ["", "Control", "", "Treatment", "", "", ""],
        ["study", "mean", "n", "mean", "n", "note", "site"],
    ]
    assert join_lines(lines, 0, 2) == [
        *("study", "Control mean", "Control n", "Treatment mean", "Treatment n", "note", "site")
    ]


def test_padding_rows_and_unnamed_columns(tmp_path):
    lines = [[*FLAT, "", "crop"], *([*row, "spare", "oat"] for row in NUMBERS)]
    lines.insert(3, [None] * 9)
    lines += [[None] * 9] * 5
    proposal, intake = taken(write(tmp_path / "a.csv", lines))
    assert proposal.rows == 4
    assert list(intake.rows["sheet_row"]) == [2, 3, 5, 6]
    assert "unnamed column" in set(intake.findings["rule"])


def test_repeated_headers_are_told_apart_by_their_letters(tmp_path):
    lines = [[*FLAT, "crop", "crop"], *([*row, "oat", "rye"] for row in NUMBERS)]
    proposal, intake = taken(write(tmp_path / "a.csv", lines))
    assert proposal.moderators == ("crop (column H)", "crop (column I)")
    assert list(intake.rows["crop (column I)"]) == ["rye"] * 4
    assert "repeated header" in set(intake.findings["rule"])


def test_reading_once_gives_what_the_config_gives(tmp_path):
    book = {"x": [["a", "b"]], "rows": [[], FLAT, *NUMBERS], "studies": [["study"], ["Alder 2001"]]}
    paths = [save_xlsx(tmp_path / "a.xlsx", book)]
    paths.append(write(tmp_path / "b.csv", [[*FLAT, ""], *([*row, "x"] for row in NUMBERS)], ";"))
    (tmp_path / "c").mkdir()
    paths.append(tmp_path / "c")
    write(paths[2] / "rows.csv", [FLAT, *NUMBERS])
    write(paths[2] / "studies.csv", [["study"], ["Birch & Moss 2004"]], encoding="cp1252")
    for path in paths:
        sources = read_sources(path)
        assert raw_sheet(sources, propose(sources, "x").layout, path.name) == of_file(path)[1]


def test_the_sheet_with_both_arms_is_chosen_among_others(tmp_path):
    book = {
        "README": [["This is an invented workbook"], ["with", "several", "sheets"]],
        "papers": [["study", "year", "mean age"], ["Alder 2001", 2001, 4]],
        "extraction": [FLAT, *NUMBERS],
    }
    proposal, intake = taken(save_xlsx(tmp_path / "a.xlsx", book))
    assert proposal.layout.sheet == "extraction"
    assert arm_numbers(intake) == EXPECTED


def test_codebook_sheet_explains_headers_that_say_nothing():
    codebook = [
        ["column", "meaning"],
        ["v1", "citation of the paper"],
        ["v2", "mean of the control plots, t/ha"],
        ["v3", "standard deviation of control"],
        ["v4", "number of replicates, control"],
        ["v5", "mean of the fertilised treatment"],
        ["v6", "standard deviation of treatment"],
        ["v7", "number of replicates, treatment"],
    ]
    proposal = guess([f"v{i}" for i in range(1, 8)], *NUMBERS, codebook=codebook)
    assert proposal.codebook
    found = mapping(proposal)
    assert [found.get(name) for name in ("study", *ARM_COLUMNS)] == [f"v{i}" for i in range(1, 8)]


def test_folder_of_csv_files_with_names_of_its_own(tmp_path):
    write(tmp_path / "papers.csv", [["study", "doi"], ["Alder 2001", "10.0/x"]])
    write(tmp_path / "rows.csv", [FLAT, *NUMBERS])
    proposal, intake = taken(tmp_path)
    assert proposal.layout.sheet == "rows.csv"
    assert arm_numbers(intake) == EXPECTED


def test_semicolons_and_decimal_commas_are_converted_and_said(tmp_path):
    lines = [FLAT, *([str(cell).replace(".", ",") for cell in row] for row in NUMBERS)]
    _, intake = taken(write(tmp_path / "a.csv", lines, ";"))
    assert arm_numbers(intake) == EXPECTED
    said = intake.findings.set_index("rule")
    assert said.loc["decimal commas", "level"] == said.loc["semicolons", "level"] == "fixed"
    # by hand: four numbers with a comma in each of four rows
    assert said.loc["decimal commas", "wrong"].startswith("16 numbers")
    assert (said.loc["decimal commas", "cell"], said.loc["decimal commas", "value"]) == (
        "B2",
        "4,1",
    )


@pytest.mark.parametrize("odd", ["1,234", "4.5"])
def test_commas_that_may_be_thousands_stay_findings(tmp_path, odd):
    line = ["Alder 2001", "1,234", "2,345", 4, odd, "3,456", 4]
    _, intake = taken(write(tmp_path / "a.csv", [FLAT, line, *([line] * 3)], ";"))
    assert "decimal commas" not in set(intake.findings["rule"])
    stops = intake.findings[intake.findings["level"] == "stop"]
    assert "1,234" in set(stops["value"])


@pytest.mark.parametrize("encoding", ["cp1252", "mac_roman"])
@pytest.mark.parametrize(
    "names",
    [
        ["Müller 2001", "Løvås 2003", "Peña 2004", "Çelik 1999"],
        ["Österreich 2001", "Århus 2002", "Étude 2003", "Ünal 2004"],
        ["Façade – été 2001", "it’s 2002", "5 ± 2 Größe 2003", "São 2004"],
    ],
)
def test_old_code_pages_are_told_apart(tmp_path, encoding, names):
    lines = [FLAT, *((name, *row[1:]) for name, row in zip(names, NUMBERS, strict=True))]
    _, intake = taken(write(tmp_path / "a.csv", lines, encoding=encoding))
    assert list(intake.rows["study"]) == names
    assert "not UTF-8" in set(intake.findings["rule"])


def test_text_na_and_years_of_two_digits_are_kept_apart(tmp_path):
    years = ["1999_2000", "2001", "NA", "2003"]
    rows = [[*row, year] for row, year in zip(NUMBERS, years, strict=True)]
    rows[1][2] = rows[3][3] = "NA"
    proposal, intake = taken(write(tmp_path / "a.csv", [[*FLAT, "year"], *rows]))
    # Alder 2001 has two rows, of 1999_2000 and of no known year: one year, so no date.
    assert "date" not in mapping(proposal)
    rows[2][7] = "2002"
    proposal, intake = taken(write(tmp_path / "b.csv", [[*FLAT, "year"], *rows]))
    assert mapping(proposal)["date"] == "year"
    assert list(intake.rows["date"]) == ["1999_2000", "2001", "2002", "2003"]
    assert intake.rows["control_sd"].isna().tolist() == [False, True, False, False]


def test_outcomes_units_and_scales(tmp_path):
    more = [
        ("grain yield", "t/ha"),
        ("Grain Yield", "t/ha"),
        ("soil pH", "pH"),
        ("cover", "%"),
    ] * 2
    rows = [(*row, *pair) for row, pair in zip(NUMBERS * 2, more, strict=True)]
    proposal, intake = taken(write(tmp_path / "a.csv", [[*FLAT, "response", "units"], *rows]))
    found = {item.name: (item.rows, item.unit, item.scale) for item in proposal.outcomes}
    assert found == {
        "grain yield": (4, "t/ha", "ratio"),
        "soil pH": (2, "pH", "interval"),
        "cover": (2, "%", "bounded"),
    }
    assert len(intake.usable) == 4


def test_unit_in_the_header_becomes_the_unit_of_the_only_outcome():
    headers = ["Mean C (t/ha)", "SD C", "n C", "Mean T (t/ha)", "SD T", "n T"]
    proposal = guess(["study", *headers], *NUMBERS)
    assert [(item.name, item.unit) for item in proposal.outcomes] == [("outcome", "t/ha")]
    assert any("no column says what was measured" in ask for ask in proposal.asks)


NASTY = ["a: b", "yes", "#1", '"x"', "{y}", "- z", "naïve 'q'", "tab\tin", "=1+1"]


def test_config_text_reads_back_as_the_proposal(tmp_path):
    rows = [(*NUMBERS[i % 4], name) for i, name in enumerate(NASTY * 3)]
    lines = [[*FLAT, "trait: of 'all' #1"], *rows]
    sources = [Source("sheet: 1 #", lines), Source("other", [["a"]])]
    proposal = propose(sources, "x.xlsx")
    text = config_text(proposal, "data/x: #y.xlsx", "x\n- evil: 1.xlsx")
    wanted = settings_from(proposal.settings("data/x: #y.xlsx"))
    read = parse_settings(text)
    assert read.columns == wanted.columns
    assert read.outcomes == wanted.outcomes
    assert read.layout == wanted.layout
    assert read.all_analyses() == wanted.all_analyses()
    assert read.sheet == "data/x: #y.xlsx"


def test_outcomes_that_would_share_a_folder_get_analyses_of_their_own():
    long = "dry matter of shoots and roots together at the end of the growing season, "
    rows = [(*row, long + word) for row, word in zip(NUMBERS, "abab", strict=True)]
    proposal = guess([*FLAT, "outcome"], *rows)
    settings = parse_settings(config_text(proposal, "x.csv", "x.csv"))
    assert len(settings.all_analyses()) == 2


def test_every_reason_stands_in_the_config():
    proposal = guess([*FLAT, "C_se"], *((*row, 0.2) for row in NUMBERS))
    text = config_text(proposal, "x.csv", "x.csv")
    for found in (*proposal.columns, *proposal.spare):
        assert f'{found.ours}: "{found.theirs}"  # {found.reason}' in text
    for ask in proposal.asks:
        assert f"# DECIDE: {ask}" in text


def test_screen_is_short_however_many_findings_there_are():
    lines = [Line("warn", f"rule {i}", "", "s", 3, ("A1", "A2"), "w " * 80, "t") for i in range(60)]
    shown = finding_lines(lines, 11)
    assert len(shown) <= 11
    assert all(len(line) <= WIDTH for line in shown)
    assert shown[-1] == "and 55 more kinds of findings (55 warn)"
    wide = [*FLAT, *(f"moderator {i}" for i in range(60))]
    head = guess_lines(guess(wide, *((*row, *[1] * 60) for row in NUMBERS)), "x.csv")
    assert len(head) < 20
    assert all(len(line) <= WIDTH for line in head)


def test_intake_through_a_proposal_balances(tmp_path):
    lines = [FLAT, *NUMBERS, ["", 1, 2, 3, 4, 5, 6], [STUDIES[0], "x", "", "", "", "", ""]]
    _, intake = taken(write(tmp_path / "a.csv", lines))
    assert balances(intake)
    assert len(read_sources(tmp_path / "a.csv")) == 1
