"""`drystone compare-extractions` as a person meets it; both sheets are invented."""

from __future__ import annotations

import pandas as pd
import yaml
from click.testing import CliRunner
from sheet.guess.messy_sheets import NUMBERS, write
from sheet.typed_sheets import PLAIN, save_xlsx

from drystone import cli

FLAT = ["paper", "C_mean", "C_sd", "C_n", "T_mean", "T_sd", "T_n"]


def command(*words):
    return CliRunner().invoke(cli.cli, ["compare-extractions", *map(str, words)])


def two_sheets(folder):
    other = [list(row) for row in NUMBERS]
    other[1][1] = 32.0
    other[3][3] = 7
    return (
        write(folder / "a.csv", [FLAT, *NUMBERS]),
        write(folder / "b.csv", [FLAT, *other]),
    )


def test_own_layouts_are_compared_without_a_config(tmp_path):
    a, b = two_sheets(tmp_path)
    done = command(a, b, "--to", tmp_path / "out")
    assert done.exit_code == 3, done.output
    assert "4 rows stand in both sheets" in done.output
    # ln 32 - ln 3.2 = ln 10 = 2.30
    assert (
        "control_mean: 1 of 4 differ (75.0 % agree); changes a log ratio by up to 2.3"
        in done.output
    )
    assert "A B3 3.2, B B3 32" in done.output
    cells = pd.read_csv(tmp_path / "out" / "disagreements.csv")
    assert list(cells["column"]) == ["control_mean", "control_n"]
    assert list(pd.read_csv(tmp_path / "out" / "agreement.csv").columns) == [
        *("column", "compared", "agreeing", "percent", "kappa")
    ]


def test_equal_sheets_end_with_zero(tmp_path):
    a, _ = two_sheets(tmp_path)
    done = command(a, a, "--to", tmp_path / "out")
    assert done.exit_code == 0
    assert "0 disagreements" in done.output


def test_resolutions_are_kept_while_the_cells_are_the_same(tmp_path):
    a, b = two_sheets(tmp_path)
    out = tmp_path / "out"
    command(a, b, "--to", out)
    cells = pd.read_csv(out / "disagreements.csv", dtype=str)
    cells["resolution"], cells["resolved_by"] = ["a", "b"], ["RH", "RH"]
    cells.to_csv(out / "disagreements.csv", index=False)
    assert "2 disagreements, 2 resolved" in command(a, b, "--to", out).output
    text = b.read_text().replace("32.0", "33.0")
    b.write_text(text)
    assert "2 disagreements, 1 resolved" in command(a, b, "--to", out).output
    again = pd.read_csv(out / "disagreements.csv", dtype=str).fillna("").set_index("column")
    assert again.loc["control_n", "resolution"] == "b"
    assert again.loc["control_mean", "resolution"] == ""


def test_a_config_serves_both_sheets(tmp_path):
    other = {**PLAIN, "control_mean": 4.4}
    sheets = [
        save_xlsx(tmp_path / f"{name}.xlsx", {"s": [list(row), list(row.values())]})
        for name, row in (("a", PLAIN), ("b", other))
    ]
    config = tmp_path / "config.yaml"
    config.write_text(yaml.safe_dump({"sheet": "a.xlsx", "outcomes": {"yield": {"unit": "t/ha"}}}))
    done = command(*sheets, "--config", config, "--to", tmp_path / "out", "--tolerance", "0.05")
    assert done.exit_code == 3
    done = command(*sheets, "--config", config, "--to", tmp_path / "out", "--tolerance", "0.1")
    assert done.exit_code == 0
