"""Kinds of spread, centre and replication that a paper can report."""

SD = "SD"
SE = "SE"
CI = "CI"
CI_BY_Z = "CI (z)"  # made as mean +- z SE, which the paper says
IQR = "IQR"
RANGE = "range"
VARIANCE = "variance"
CV_PERCENT = "CV%"
UNLABELLED = "unlabelled"

SPREAD_KINDS: tuple[str, ...] = (SD, SE, CI, CI_BY_Z, IQR, RANGE, VARIANCE, CV_PERCENT, UNLABELLED)

POOLED_SD = "pooled SD"
MSE = "MSE"
SEM = "SEM"
SED = "SED"
LSD = "LSD"
HSD = "HSD"
TABLE_CV_PERCENT = "CV% of the grand mean"

POOLED_KINDS: tuple[str, ...] = (POOLED_SD, MSE, SEM, SED, LSD, HSD, TABLE_CV_PERCENT)

MEAN = "mean"
MEDIAN = "median"
GEOMETRIC_MEAN = "geometric mean"
MEAN_OF_LOGS = "mean of logs"  # natural logarithms
MEAN_OF_LOG10 = "mean of log10"

CENTRE_KINDS: tuple[str, ...] = (MEAN, MEDIAN, GEOMETRIC_MEAN, MEAN_OF_LOGS, MEAN_OF_LOG10)
LOG_CENTRES: tuple[str, ...] = (MEAN_OF_LOGS, MEAN_OF_LOG10)

N_MEANINGS: tuple[str, ...] = ("replicate", "subsample", "individual")

T = "t"
F = "F"
P = "p"
TEST_KINDS: tuple[str, ...] = (T, F, P)

DESIGNS: tuple[str, ...] = (
    "independent",
    "paired",
    "block",
    "split plot",
    "repeated",
    "clustered",
    "before-after",
)
WITHIN_BLOCKS: frozenset[str] = frozenset(("paired", "block", "split plot", "repeated"))
"""Designs whose residual has the blocks, pairs or plots taken out."""
