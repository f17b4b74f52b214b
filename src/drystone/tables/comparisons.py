"""The extraction sheet: one row = one comparison of a treatment arm with a control arm.

Column order is the order of the template; the first twenty stand open there, the other groups
are folded.
"""

from __future__ import annotations

import pandera.pandas as pa

from drystone.tables.columns import NUMBERS, RECORD, number, schema, text
from drystone.words import arms, spreads

SAME = "same unit as the mean"


def _front() -> dict[str, pa.Column]:
    """Give the twenty columns that most teams need, in reading order."""
    who = "who"
    return {
        "row_id": text("name of this row; never changes, never reused", group=who),
        "study": text("short name of the study, as in the studies sheet", required=True, group=who),
        "site": text("site or location within the study", group=who),
        "species": text("species, Latin name", group=who),
        "outcome": text("what was measured, as named in the config", required=True, group=who),
        "unit": text("unit of both means", group=who),
        "control_id": text(
            "name of the control arm, unique in the study; the same name in several rows says "
            "that they share this arm",
            group=who,
        ),
        "treatment_id": text("name of the treatment arm, unique in the study", group=who),
        "control_label": text("what the control was", use=RECORD, group=who),
        "treatment_label": text("what the treatment was", use=RECORD, group=who),
        "control_mean": number("mean of the control arm", unit="outcome unit", group="control"),
        "control_sd": number("standard deviation of the control arm", unit=SAME, group="control"),
        "control_n": number("replicates of the control arm", unit="count", group="control"),
        "treatment_mean": number(
            "mean of the treatment arm", unit="outcome unit", group="treatment"
        ),
        "treatment_sd": number(
            "standard deviation of the treatment arm", unit=SAME, group="treatment"
        ),
        "treatment_n": number("replicates of the treatment arm", unit="count", group="treatment"),
        "control_spread": number(
            "spread of the control arm as printed", unit="see its kind", group="control"
        ),
        "treatment_spread": number(
            "spread of the treatment arm as printed", unit="see its kind", group="treatment"
        ),
        "control_spread_kind": text(
            "what the control spread is", allowed=spreads.SPREAD_KINDS, group="control"
        ),
        "treatment_spread_kind": text(
            "what the treatment spread is", allowed=spreads.SPREAD_KINDS, group="treatment"
        ),
    }


def _arm(arm: str) -> dict[str, pa.Column]:
    """Give the folded columns of one arm."""
    group = f"{arm}, more"
    return {
        f"{arm}_centre_kind": text(
            f"what the {arm} mean is: a median stands in the column of the mean, and so does the "
            "mean of natural or of base-10 logarithms, with its SD or SE of logarithms",
            allowed=spreads.CENTRE_KINDS,
            group=group,
        ),
        f"{arm}_n_meaning": text(
            f"what the {arm} n counts", allowed=spreads.N_MEANINGS, group=group
        ),
        f"{arm}_lower": number(f"lower limit of the {arm} mean", unit=SAME, group=group),
        f"{arm}_upper": number(f"upper limit of the {arm} mean", unit=SAME, group=group),
        f"{arm}_q1": number(f"first quartile of the {arm} arm", unit=SAME, group=group),
        f"{arm}_q3": number(f"third quartile of the {arm} arm", unit=SAME, group=group),
        f"{arm}_min": number(f"smallest value of the {arm} arm", unit=SAME, group=group),
        f"{arm}_max": number(f"largest value of the {arm} arm", unit=SAME, group=group),
        f"{arm}_source_place": text(
            f"where in the paper the {arm} numbers stand", use=RECORD, group=group
        ),
        f"{arm}_digitised": text(
            "yes when read off a figure", allowed=("yes", "no"), use=RECORD, group=group
        ),
    }


def _row() -> dict[str, pa.Column]:
    """Give the folded columns that belong to the row as a whole."""
    pooled, design, people = "one spread for both arms", "design", "people"
    return {
        "pooled_spread": number(
            "one spread for both arms, as printed", unit="see its kind", group=pooled
        ),
        "pooled_kind": text(
            "what the pooled spread is", allowed=spreads.POOLED_KINDS, group=pooled
        ),
        "difference_lower": number(
            "lower limit of the difference of the two means", unit=SAME, group=pooled
        ),
        "difference_upper": number(
            "upper limit of the difference of the two means", unit=SAME, group=pooled
        ),
        "grand_mean": number(
            "mean of the whole table, for a CV% of the grand mean",
            unit="outcome unit",
            group=pooled,
        ),
        "number_of_means": number(
            "means compared by the HSD or F: 2 when F compares these two arms alone",
            unit="count",
            group=pooled,
        ),
        "error_df": number(
            "degrees of freedom of the error, for an LSD, HSD or p", unit="count", group=pooled
        ),
        "confidence_percent": number(
            "level of the limits, of the LSD or HSD (95 for 0.05); 95 when blank",
            unit="%",
            at_least=1,
            group=pooled,
        ),
        "test_kind": text(
            "which statistic of the difference is given: t, F or exact two-sided p",
            allowed=spreads.TEST_KINDS,
            group=pooled,
        ),
        "test_value": number("value of that statistic", group=pooled),
        "trial": text("trial or experiment within the study", group=design),
        "date": text("sampling date, year or season", group=design),
        "design": text(
            "design words, separated by commas: " + ", ".join(spreads.DESIGNS), group=design
        ),
        "arm_correlation": number("correlation between the arms", group=design),
        "time_correlation": number("correlation between dates", group=design),
        "cluster_size": number("subsamples per replicate", unit="count", group=design),
        "icc": number("intraclass correlation of the subsamples", group=design),
        "control_baseline_mean": number("control mean before treatment", group=design),
        "treatment_baseline_mean": number("treatment mean before treatment", group=design),
        "exclude_reason": text(
            "why the team leaves this row out; rows are never deleted", group=people
        ),
        "extractor": text("who typed the row", use=RECORD, group=people),
        "checker": text("who checked the row", use=RECORD, group=people),
        "note": text("anything else", use=RECORD, group=people),
    }


COLUMNS: dict[str, pa.Column] = {
    **_front(),
    **_arm(arms.CONTROL),
    **_arm(arms.TREATMENT),
    **_row(),
}
SCHEMA = schema("comparisons", "one comparison of a treatment arm with a control arm", COLUMNS)

OPEN_COLUMNS: tuple[str, ...] = tuple(_front())
NUMBER_COLUMNS: tuple[str, ...] = tuple(
    name for name, column in COLUMNS.items() if str(column.dtype) == "float64"
)
NUMBERS_USED: tuple[str, ...] = tuple(
    name for name, column in COLUMNS.items() if column.metadata["use"] == NUMBERS
)
