"""Levels of a finding: how far a row can go with it.

stop: the row cannot be used. ask: a person must decide; a stated default holds until then.
warn: worth a look. fixed: converted, with a record.
"""

STOP = "stop"
ASK = "ask"
WARN = "warn"
FIXED = "fixed"

LEVELS: tuple[str, ...] = (STOP, ASK, WARN, FIXED)
