"""What is wrong in the flawed twin of the demo: edited rows, added rows, and why.

Codes are those of a catalogue of what editors and readers complain about in quantitative reviews;
each flaw names the rule of the check that should speak. All numbers are invented.
"""

from __future__ import annotations

import datetime
import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

from demo_numbers import Row


@dataclass(frozen=True)
class Flaw:
    """One planted flaw.

    Parameters
    ----------
    row_id : row of the finding; blank when the finding is about an outcome as a whole
    column : column of the finding
    code : in the catalogue
    rule : of the check, that should speak
    done : what was done to the sheet
    cells : new cells of that row
    also : further rules that speak because of the same flaw
    """

    row_id: str
    column: str
    code: str
    rule: str
    done: str
    cells: Mapping[str, object] = field(default_factory=dict)
    also: tuple[str, ...] = ()


def edits(rows: Mapping[str, Row]) -> list[Flaw]:
    """Flaws in rows of the demo, by row id; ``rows`` are the clean ones."""
    return [
        *_spread_edits(rows),
        *_arm_edits(rows),
        *_count_edits(),
        *_cell_edits(rows),
        *_own_flaws(),
    ]


def _spread_edits(rows: Mapping[str, Row]) -> list[Flaw]:
    taken = [
        Flaw(
            f"{study}-{number}",
            "control_sd",
            "E1",
            "SE taken for SD",
            "standard errors of the paper stand in the SD columns",
            {
                f"{arm}_sd": round(_sd(rows, row_id, arm) / math.sqrt(rows[row_id][f"{arm}_n"]), 2)
                for arm in ("control", "treatment")
            },
        )
        for study, numbers in (("skarrow-head-2016", (4, 5)), ("lunky-gap-2018", (1, 2, 3)))
        for number in numbers
        if (row_id := f"{study}-{number}")
    ]
    turned = [
        Flaw(
            row_id,
            "control_mean",
            "E1" if row_id.endswith("3") else "",
            "normal approximation",
            "SDs of the paper stand as spreads of kind SE in this row and the two before",
            {
                f"{arm}_spread": round(
                    rows[row_id][f"{arm}_spread"] * math.sqrt(rows[row_id][f"{arm}_n"]), 2
                )
                for arm in ("control", "treatment")
            },
            ("CV far out",),
        )
        for row_id in (f"winter-pasture-2010-{number}" for number in (1, 2, 3))
    ]
    return [
        *taken,
        *turned,
        Flaw(
            "hollin-fell-2009-1",
            "control_spread",
            "E2",
            "spread without a kind",
            "'±' without a label in the paper, kind left blank",
            {"control_spread_kind": None, "treatment_spread_kind": None},
        ),
        Flaw(
            "hollin-fell-2009-2",
            "control_spread",
            "E2",
            "spread not converted",
            "'±' without a label in the paper, kind typed as unlabelled",
            {"control_spread_kind": "unlabelled", "treatment_spread_kind": "unlabelled"},
        ),
        Flaw(
            "westerclough-2000-1",
            "pooled_spread",
            "E16",
            "spread not converted",
            "an LSD without its error df",
            {"pooled_spread": 1.31, "pooled_kind": "LSD"},
        ),
        Flaw(
            "westerclough-2000-2",
            "pooled_spread",
            "E17",
            "spread not converted",
            "the CV% of the analysis of variance without the grand mean",
            {"pooled_spread": 14.2, "pooled_kind": "CV% of the grand mean"},
        ),
        Flaw(
            "millstone-bank-2013-1",
            "design",
            "E18",
            "design not used",
            "SDs of a block design, where the blocks are taken out already",
            {"design": "block"},
        ),
        Flaw(
            "lunn-garth-2019-5",
            "treatment_lower",
            "E19",
            "CI not used",
            "a back-transformed interval: its upper half is the longer one",
            {"treatment_upper": round(rows["lunn-garth-2019-5"]["treatment_upper"] * 1.4, 2)},
        ),
        Flaw(
            "swarth-gill-2003-1",
            "control_q1",
            "E20",
            "IQR not used",
            "quartiles beyond the typed mean: the arm is skewed",
            {"control_q1": 5.7, "control_q3": 8.1},
        ),
        Flaw(
            "smoot-hole-2014-2",
            "treatment_centre_kind",
            "E21",
            "centre is no mean",
            "geometric means, as the footnote says",
            {"treatment_centre_kind": "geometric mean"},
        ),
        Flaw(
            "nettlehowe-2014-1",
            "treatment_sd",
            "E1",
            "CV far out",
            "the point slipped by one place",
            {"treatment_sd": round(rows["nettlehowe-2014-1"]["treatment_sd"] / 10, 2)},
        ),
        Flaw(
            "bracken-hass-2009-1",
            "test_value",
            "E30",
            "unreadable cell",
            "a bound of p stands where an exact p belongs",
            {"test_kind": "p", "test_value": "<0.05"},
        ),
    ]


def _arm_edits(rows: Mapping[str, Row]) -> list[Flaw]:
    return [
        Flaw("kirn-barrow-2011-1", "", "", "", "", {"control_id": None}),
        Flaw("kirn-barrow-2011-3", "", "", "", "", {"control_id": None}),
        Flaw(
            "kirn-barrow-2011-2",
            "control_mean",
            "E3",
            "shared control",
            "one control in three rows, and no name for it",
            {"control_id": None},
        ),
        Flaw(
            "long-stoop-1995-2",
            "control_mean",
            "E3",
            "shared control",
            "one control in two rows under two names",
            {"control_id": "open-1"},
        ),
        Flaw(
            "copestone-2012-6",
            "treatment_mean",
            "E12",
            "arms swapped",
            "all cells of the two arms in each other's place",
            _swapped(rows["copestone-2012-6"]),
        ),
        Flaw(
            "ling-hagg-2004-3",
            "treatment_mean",
            "E12",
            "control is the treatment",
            "the control's numbers were copied into the treatment's cells",
            {
                f"treatment_{what}": rows["ling-hagg-2004-3"][f"control_{what}"]
                for what in ("mean", "sd", "n")
            },
        ),
    ]


def _count_edits() -> list[Flaw]:
    return [
        Flaw(
            "ewe-crag-2020-1",
            "control_n",
            "E13",
            "n may count subsamples",
            "twenty cores in each of three plots, counted as sixty",
            {"control_n": 60, "treatment_n": 60},
        ),
        Flaw(
            "throughstone-2019-2",
            "treatment_n",
            "E14",
            "n as a range",
            "n as the paper gives it, for all plots together",
            {"treatment_n": "4-5"},
        ),
        Flaw(
            "sheepwash-2008-1",
            "control_n",
            "E15",
            "n may be the total",
            "plots of both arms together in both columns",
            {"control_n": 24, "treatment_n": 24},
        ),
    ]


def _cell_edits(rows: Mapping[str, Row]) -> list[Flaw]:
    return [
        Flaw(
            "oxclose-rake-1999-3",
            "treatment_mean",
            "E5",
            "negative mean",
            "a change since the year before in place of the yield",
            {"treatment_mean": -0.84},
        ),
        Flaw(
            "wether-rigg-1994-3",
            "treatment_mean",
            "E25",
            "digits of a figure",
            "a mean read off a figure with all digits that the screen gave",
            {"treatment_mean": rows["wether-rigg-1994-3"]["treatment_mean"] + 0.00374},
        ),
        Flaw(
            "tarnbeck-2006-3",
            "treatment_mean",
            "E26",
            "ratio near a power of ten",
            "the treatment in kg/ha, the control in t/ha",
            {"treatment_mean": round(1000 * rows["tarnbeck-2006-3"]["treatment_mean"])},
        ),
        Flaw(
            "oxclose-rake-1999-2",
            "treatment_mean",
            "E26",
            "ratio near a power of ten",
            "the point slipped by one place",
            {"treatment_mean": round(10 * rows["oxclose-rake-1999-2"]["treatment_mean"], 1)},
        ),
        Flaw(
            "brackmoor-2001-1",
            "unit",
            "E26",
            "another unit",
            "both arms in kg/ha",
            {
                "unit": "kg/ha",
                **{
                    f"{arm}_mean": round(1000 * rows["brackmoor-2001-1"][f"{arm}_mean"])
                    for arm in ("control", "treatment")
                },
            },
        ),
        Flaw(
            "throughstone-2019-3",
            "treatment_n",
            "E27",
            "unreadable cell",
            "'3-5' that the spreadsheet made into a date",
            {"treatment_n": datetime.date(2019, 5, 3)},
        ),
        Flaw(
            "smoot-hole-2014-1",
            "treatment_mean",
            "E27",
            "unreadable cell",
            "a star of significance behind the number",
            {"treatment_mean": f"{rows['smoot-hole-2014-1']['treatment_mean']}*"},
        ),
        Flaw(
            "cold-bield-1998-1",
            "treatment_mean",
            "E27",
            "unreadable cell",
            "an en dash in place of a minus sign",
            {"treatment_mean": "–0.42"},
        ),
        Flaw(
            "rushy-slack-2002-1",
            "treatment_label",
            "E27",
            "date for a name",
            "the label 'MAR-2' that the spreadsheet made into a date",
            {"treatment_label": datetime.date(2002, 3, 2)},
        ),
        Flaw(
            "grizeholme-2022-1",
            "row_id",
            "E28",
            "repeated row_id",
            "the name of a row was given twice",
        ),
        Flaw("grizeholme-2022-2", "", "", "", "", {"row_id": "grizeholme-2022-1"}),
        Flaw(
            "high-pinfold-2018-4",
            "control_baseline_mean",
            "E32",
            "baseline not used",
            "means before the walls were built, in which the arms differ",
            {"control_baseline_mean": 9.1, "treatment_baseline_mean": 12.9},
        ),
    ]


def _own_flaws() -> list[Flaw]:
    """Give what the demo itself holds."""
    return [
        Flaw("thrang-moss-2005-3", "treatment_mean", "E6", "zero mean", "as in the demo"),
        Flaw("far-intake-2021-1", "treatment_sd", "E23", "zero spread", "as in the demo"),
        Flaw("skarrow-head-2016-6", "control_n", "E14", "missing n", "as in the demo"),
    ]


def _sd(rows: Mapping[str, Row], row_id: str, arm: str) -> float:
    return float(rows[row_id][f"{arm}_sd"])


def _swapped(row: Row) -> dict[str, object]:
    cells: dict[str, object] = {}
    for name, value in row.items():
        arm, _, what = name.partition("_")
        if arm in ("control", "treatment"):
            cells[f"{'treatment' if arm == 'control' else 'control'}_{what}"] = value
    return cells


@dataclass(frozen=True)
class Extra:
    """An outcome that the twin adds: the rows, and the flaw that they show as a whole."""

    outcome: str
    unit: str
    flaw: Flaw | None
    numbers: Sequence[tuple[str, float, float, int, float, float, int]]
    flaws: tuple[Flaw, ...] = ()
    cells: Mapping[str, object] = field(default_factory=dict)


def _whole(code: str, rule: str, done: str) -> Flaw:
    return Flaw("", "outcome", code, rule, done)


EXTRAS: tuple[Extra, ...] = (
    Extra(
        "soil temperature",
        "°C",
        _whole("E7", "no true zero", "temperatures in degrees Celsius"),
        (
            ("Stang End 1997", 9.4, 0.6, 6, 10.8, 0.7, 6),
            ("Ling Hagg 2004", 11.2, 0.8, 5, 12.1, 0.5, 5),
            ("Yowden 2013", 8.7, 0.4, 4, 9.9, 0.6, 4),
        ),
    ),
    Extra(
        "soil bacteria",
        "log10 CFU/g",
        _whole("E22", "logarithms", "logarithms of counts"),
        (
            ("Throughstone 2019", 6.31, 0.22, 5, 6.78, 0.31, 5),
            ("Ewe Crag 2020", 5.94, 0.18, 6, 6.02, 0.27, 6),
        ),
    ),
    Extra(
        "sward height change",
        "cm",
        _whole("E9", "change as outcome", "changes between two dates"),
        (
            ("Sikefold 2007", 3.1, 1.2, 6, 4.4, 1.6, 6),
            ("Brackmoor 2001", 2.6, 0.9, 5, 2.2, 1.1, 5),
        ),
    ),
    Extra(
        "sward condition score",
        "points",
        _whole("E7", "index as outcome", "scores from 1 to 5"),
        (
            ("Gimmer Edge 1996", 3.2, 0.6, 8, 3.9, 0.5, 8),
            ("Smoot Hole 2014", 2.8, 0.7, 7, 3.3, 0.9, 7),
        ),
    ),
    Extra(
        "clover cover",
        "%",
        _whole("E8", "bounded outcome", "cover in percent"),
        (
            ("Rushy Slack 2002", 21.0, 6.5, 5, 27.0, 8.0, 5),
            ("Cold Bield 1998", 12.0, 4.4, 5, 18.5, 55.0, 5),
            ("Long Stoop 1995", 34.0, 9.1, 6, 31.0, 7.7, 6),
        ),
        (
            Flaw(
                "cold-bield-1998-clover-cover",
                "treatment_sd",
                "E29",
                "SD above the possible",
                "a typing error: 5.50 became 55.0, more than cover between 0 and 100 % allows",
                also=("normal approximation",),
            ),
        ),
    ),
    Extra(
        "seedling mortality",
        "seedlings per m2",
        _whole("E11", "direction", "less is better, and the config does not say so"),
        (
            ("Lunn Garth 2019", 41.0, 12.0, 5, 33.0, 11.0, 5),
            ("Far Intake 2021", 28.0, 9.0, 6, 30.0, 8.5, 6),
        ),
    ),
    Extra(
        "root to shoot ratio",
        "g per g",
        _whole("E31", "ratio of ratios", "a ratio of two masses"),
        (
            ("Skarrow Head 2016", 0.62, 0.12, 6, 0.55, 0.10, 6),
            ("Capplestone 2023", 0.71, 0.15, 7, 0.66, 0.14, 7),
        ),
    ),
    Extra(
        "ground beetle larvae",
        "number of larvae",
        None,
        (
            ("Ravock Scar 2012", 3.45, 1.19, 20, 4.1, 1.37, 20),
            ("Dunnock Lea 2010", 3.47, 1.2, 20, 5.05, 1.64, 20),
            ("Fallow Reins 2017", 3.45, 1.16, 20, 3.9, 1.25, 20),
        ),
        (
            Flaw(
                "dunnock-lea-2010-ground-beetle-larvae",
                "control_mean",
                "E29",
                "mean not of counts",
                "69 larvae in 20 traps are 3.45, not 3.47",
            ),
            Flaw(
                "fallow-reins-2017-ground-beetle-larvae",
                "control_sd",
                "E29",
                "SD not of counts",
                "an SD that no 20 counts with this mean have",
            ),
        ),
        {"control_n_meaning": "individual", "treatment_n_meaning": "individual"},
    ),
    Extra("clover biomass", "g/m2", None, (("Bleaberry How 2015", 84.0, 21.0, 6, 112.0, 30.0, 6),)),
    Extra("grass biomass", "g/m2", None, (("Bleaberry How 2015", 231.0, 52.0, 6, 268.0, 61.0, 6),)),
    Extra(
        "herbage biomass",
        "g/m2",
        None,
        (("Bleaberry How 2015", 315.0, 66.0, 6, 380.0, 79.0, 6),),
        (
            Flaw(
                "bleaberry-how-2015-herbage-biomass",
                "outcome",
                "E10",
                "total and its parts",
                "a total beside its two parts",
            ),
        ),
    ),
)
