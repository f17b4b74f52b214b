"""Scales of an outcome, orders of the log response ratio, estimators, interval kinds."""

RATIO = "ratio"
SCALES: tuple[str, ...] = ("ratio", "interval", "bounded", "count")

FIRST = "first"
SECOND = "second"
ORDERS: tuple[str, ...] = (FIRST, SECOND)

LOG_RESPONSE_RATIO = "log response ratio"

REML = "REML"
ML = "ML"

CLUSTER_ROBUST = "cluster robust"
MODEL_BASED = "model based"

OVERALL = "overall"
LEVELS_OF_DEPENDENCE: tuple[str, ...] = ("study", "row")
