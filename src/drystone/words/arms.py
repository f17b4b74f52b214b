"""The two arms of a comparison."""

CONTROL = "control"
TREATMENT = "treatment"
ARMS: tuple[str, ...] = (CONTROL, TREATMENT)
