"""Exit codes of the command line."""

DONE = 0
FAILED = 1  # a step failed, or the disk or folder could not be used
CONFIG = 2  # config, sheet file or arguments cannot be used
STOPS = 3  # rows have findings of level stop (check, run --strict)
BUSY = 4  # another run holds the folder
INTERRUPTED = 130
