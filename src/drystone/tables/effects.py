"""Tables on the way from the sheet to the models; moderators are extra columns of the slice."""

import pandera.pandas as pa

from drystone.tables.columns import flag, number, schema, text, whole
from drystone.words import arms

SD_SOURCES = ("own", "other row", "none")
CV_SOURCES = ("own", "average")


def _arm_slice(arm: str) -> dict[str, pa.Column]:
    return {
        f"{arm}_arm": text(f"physical {arm} arm, unique in the slice", required=True),
        f"{arm}_mean": number(f"mean of the {arm} arm", unit="outcome unit", required=True),
        f"{arm}_sd": number(f"SD of the {arm} arm, blank when missing", unit="outcome unit"),
        f"{arm}_n": number(f"replicates of the {arm} arm", unit="count", required=True),
        f"{arm}_sd_source": text("where the SD came from", required=True, allowed=SD_SOURCES),
        f"{arm}_sd_pooled": flag("True when the SD is one value for both arms"),
    }


SLICE_COLUMNS = {
    "row_id": text("row", required=True),
    "study": text("study", required=True),
    "outcome": text("outcome", required=True),
    "unit": text("unit"),
    "flip": flag("True when smaller is better: the sign of the effect is turned"),
    **_arm_slice(arms.CONTROL),
    **_arm_slice(arms.TREATMENT),
}
SLICE = schema("slice", "one comparison of one analysis", SLICE_COLUMNS)
# Labels and addresses decide no number, so they are joined only where they are shown.
SHOWN_COLUMNS = ("control_label", "treatment_label", "sheet", "sheet_row", "date", "study_year")


def _arm_effect(arm: str) -> dict[str, pa.Column]:
    return {
        f"{arm}_cv": number(f"SD / mean of the {arm} arm, blank when missing"),
        f"{arm}_theta": number(f"CV^2 / n of the {arm} arm, blank when missing"),
        f"{arm}_geary": number(
            f"4 n^1.5 / (1 + 4 n) x mean / SD of the {arm} arm; below 3 the normal "
            "approximation of the log mean is doubtful"
        ),
    }


EFFECTS = schema(
    "effects",
    "one comparison, with the log response ratio from its own numbers",
    {
        "row_id": text("row", required=True),
        "study": text("study", required=True),
        "effect_first": number("log response ratio, first order", required=True),
        "variance_first": number("its sampling variance; blank without both SDs"),
        "effect_second": number("log response ratio, second order; blank without both SDs"),
        "variance_second": number("its sampling variance; blank without both SDs"),
        "second_order_share": number("part of the second-order variance beyond first order"),
        **_arm_effect(arms.CONTROL),
        **_arm_effect(arms.TREATMENT),
        "normal_enough": text(
            "normal-approximation check of both arms",
            required=True,
            allowed=("pass", "fail", "unknown"),
        ),
    },
)

SAMPLING = schema(
    "sampling",
    "one comparison as one strategy uses it",
    {
        "row_id": text("row", required=True),
        "study": text("study", required=True),
        "effect": number("log response ratio", required=True),
        "sampling_variance": number("its sampling variance", required=True),
        "control_cv2": number("squared CV used for the control arm", required=True),
        "treatment_cv2": number("squared CV used for the treatment arm", required=True),
        "control_cv_source": text("whose CV", required=True, allowed=CV_SOURCES),
        "treatment_cv_source": text("whose CV", required=True, allowed=CV_SOURCES),
    },
)

COVARIANCE = schema(
    "covariance",
    "one pair of comparisons that share an arm",
    {
        "row_id": text("row", required=True),
        "other_row_id": text("row", required=True),
        "covariance": number("sampling covariance of their effects", required=True),
    },
)

AVERAGES = schema(
    "averages",
    "one version of the average squared CV of one arm and outcome",
    {
        "outcome": text("outcome, or 'all outcomes' when pooled upward", required=True),
        "arm": text("control, treatment or both", required=True),
        "version": text("how the average was taken", required=True),
        "cv2": number("average squared CV", required=True),
        "reporting_arms": whole("arms that report an SD and went in"),
        "used": flag("True for the version that the strategy plugged in"),
        "pooled_because": text("why the average was pooled upward; blank when it was not"),
        "largest_share": number("share of the sum owned by one arm"),
        "largest_arm": text("which arm that is"),
    },
)
