"""Kinds of spread, centre and replication that a paper can report."""

SD = "SD"
SE = "SE"
CI = "CI"
IQR = "IQR"
RANGE = "range"
VARIANCE = "variance"
CV_PERCENT = "CV%"
UNLABELLED = "unlabelled"

SPREAD_KINDS: tuple[str, ...] = (SD, SE, CI, IQR, RANGE, VARIANCE, CV_PERCENT, UNLABELLED)
POOLED_KINDS: tuple[str, ...] = (
    "pooled SD",
    "MSE",
    "SEM",
    "SED",
    "LSD",
    "HSD",
    "CV% of the grand mean",
)
CENTRE_KINDS: tuple[str, ...] = ("mean", "median", "geometric mean", "mean of logs")
N_MEANINGS: tuple[str, ...] = ("replicate", "subsample", "individual")
TEST_KINDS: tuple[str, ...] = ("t", "F", "p")
DESIGNS: tuple[str, ...] = (
    "independent",
    "paired",
    "block",
    "split plot",
    "repeated",
    "clustered",
    "before-after",
)
