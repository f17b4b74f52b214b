"""Words that headers of extraction sheets are made of, and what they point to.

Common English forms; trade habit, no source.
"""

from __future__ import annotations

from drystone.words import arms

MEAN, SD, SE, N = "mean", "sd", "se", "n"
LOWER, UPPER, VARIANCE, CV, SPREAD = "lower", "upper", "variance", "cv", "spread"
Q1, Q3, SMALLEST, LARGEST = "q1", "q3", "min", "max"
MEDIAN = "median"

QUANTITIES: dict[str, frozenset[str]] = {
    MEAN: frozenset({"mean", "means", "avg", "average", "xbar", "x", "mu"}),
    SD: frozenset({"sd", "std", "stdev", "stddev", "stdv", "sigma"}),
    SE: frozenset({"se", "sem", "stderr", "ste"}),
    N: frozenset({"n", "reps", "rep", "replicates", "replicate", "replications", "nobs"}),
    LOWER: frozenset({"lower", "low", "lcl", "lci", "ll", "lo"}),
    UPPER: frozenset({"upper", "high", "ucl", "uci", "ul", "hi"}),
    VARIANCE: frozenset({"variance", "var"}),
    CV: frozenset({"cv"}),
    Q1: frozenset({"q1"}),
    Q3: frozenset({"q3"}),
    SMALLEST: frozenset({"min", "minimum", "smallest"}),
    LARGEST: frozenset({"max", "maximum", "largest"}),
    MEDIAN: frozenset({"median"}),
    SPREAD: frozenset({"error", "err", "spread", "dispersion", "variability"}),
}

PHRASES: tuple[tuple[tuple[str, ...], str], ...] = (
    (("standard", "error", "of", "the", "mean"), SE),
    (("standard", "deviation"), SD),
    (("standard", "dev"), SD),
    (("std", "deviation"), SD),
    (("std", "dev"), SD),
    (("st", "dev"), SD),
    (("s", "d"), SD),
    (("standard", "error"), SE),
    (("std", "error"), SE),
    (("std", "err"), SE),
    (("st", "err"), SE),
    (("s", "e"), SE),
    (("sample", "size"), N),
    (("number", "of", "replicates"), N),
    (("number", "of", "plots"), N),
    (("no", "of", "replicates"), N),
    (("no", "of", "plots"), N),
    (("coefficient", "of", "variation"), CV),
)

PRECEDENCE = (
    *(LOWER, UPPER, Q1, Q3, SMALLEST, LARGEST),
    *(SE, SD, VARIANCE, CV, N, MEDIAN, MEAN, SPREAD),
)

ENDS = frozenset({LOWER, UPPER, SMALLEST, LARGEST})
LIMITS = frozenset({"ci", "cl", "confidence", "limit", "bound", "interval", "range"})

STRONG: dict[str, frozenset[str]] = {
    arms.CONTROL: frozenset(
        {"control", "controls", "ctrl", "ctl", "con", "contr", "c", "ck", "check", "untreated"}
        | {"placebo"}
    ),
    arms.TREATMENT: frozenset(
        {"treatment", "treatments", "treat", "treated", "trt", "trmt", "t", "e"}
        | {"experimental", "intervention", "tmt"}
    ),
}

REFERENCES = frozenset(
    {"rural", "natural", "native", "reference", "ref", "undisturbed", "intact", "pristine"}
    | {"ambient", "conventional", "monoculture", "sole", "outside", "before", "baseline", "wild"}
    | {"none", "absent", "without", "no", "zero", "unmanaged", "historic"}
)
"""Words that often name the state one compares with; not proof."""

NEGATIONS = ("un", "non", "no", "not", "without")

COMPACT_ONLY = {"s": SD, "m": MEAN}
"""Letters that mean a quantity only when glued to an arm, as in Sc and St."""

NOT_COMPACT = frozenset({"cm", "tm", "me", "exp"})

ROW_WORDS: dict[str, frozenset[str]] = {
    "row_id": frozenset(
        {"row", "obs", "observation", "record", "es", "effect", "size", "case", "entry"}
        | {"comparison", "id", "uid", "line", "index"}
    ),
    "study": frozenset(
        {"study", "paper", "reference", "ref", "citation", "author", "authors", "article"}
        | {"publication", "source", "manuscript", "literature", "studies"}
    ),
    "outcome": frozenset(
        {"outcome", "outcomes", "trait", "response", "variable", "endpoint", "indicator"}
        | {"measure", "measurement", "measured", "parameter", "metric"}
    ),
    "unit": frozenset({"unit", "units", "uom"}),
    "site": frozenset({"site", "location", "locality", "field", "farm", "station", "place"}),
    "species": frozenset({"species", "scientific", "latin", "taxon", "binomial", "organism"}),
    "date": frozenset({"date", "year", "years", "season", "sampling", "harvest", "month"}),
    "trial": frozenset({"trial", "experiment"}),
    "note": frozenset({"note", "notes", "comment", "comments", "remark", "remarks", "details"}),
    "exclude_reason": frozenset({"exclude", "exclusion", "excluded", "reason"}),
    "extractor": frozenset({"extractor", "extracted", "coder"}),
    "checker": frozenset({"checker", "checked"}),
}

FILLERS = frozenset(
    {"name", "names", "code", "no", "number", "nr", "label", "key", "of", "the", "by"}
)
FILLERS_OF = {
    "study": frozenset({"id", "first", "short", "year"}),
    "outcome": frozenset({"what", "was"}),
    "unit": frozenset({"measure", "measurement", "outcome", "response", "variable", "mean"}),
    "exclude_reason": frozenset({"for"}),
    "row_id": frozenset(),
    "date": frozenset({"of"}),
    "trial": frozenset({"id"}),
    "site": frozenset({"id", "study"}),
}

LABEL_WORDS = frozenset({"label", "name", "description", "level", "type", "group", "what", "desc"})
ID_WORDS = frozenset({"id", "code"})

NO_ZERO = frozenset(
    {"date", "phenology", "ph", "temperature", "degc", "celsius", "fahrenheit"}
) | frozenset({"index", "score", "change", "difference", "anomaly", "jan1", "ndvi"})
"""Words of outcomes or units whose zero is a convention, so that a ratio says nothing."""

BOUNDED = frozenset({"%", "percent", "percentage", "proportion", "fraction", "probability"})
