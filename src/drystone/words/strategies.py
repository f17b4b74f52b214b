"""Names of the ways to treat missing spreads, and of the options they share."""

COMPLETE_CASES = "complete cases"
MISSING_CASES = "missing cases"
ALL_CASES = "all cases"

STRATEGIES: tuple[str, ...] = (COMPLETE_CASES, MISSING_CASES, ALL_CASES)

SQUARE_OF_MEAN = "square of mean"
MEAN_OF_SQUARES = "mean of squares"
AVERAGE_CV: tuple[str, ...] = (SQUARE_OF_MEAN, MEAN_OF_SQUARES)

BY_ARM = "each arm"
BOTH_ARMS = "both arms"
AVERAGE_OVER: tuple[str, ...] = (BY_ARM, BOTH_ARMS)

ALL_ROWS = "all"
COMPLETE_ROWS = "complete"
ROW_SETS: tuple[str, ...] = (ALL_ROWS, COMPLETE_ROWS)
