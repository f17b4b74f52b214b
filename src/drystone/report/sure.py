"""How sure: strategies side by side, intervals of both kinds, and how much true effects differ."""

from __future__ import annotations

from dataclasses import dataclass
from functools import partial

from drystone.report import few_studies, numbers
from drystone.report.facts import (
    AnalysisFacts,
    ModelFacts,
    Record,
    ReportFacts,
    StrategyFacts,
    main_model,
    number_of,
    records,
)
from drystone.report.scale import Bar, RatioScale, Tick, ratio_scale
from drystone.report.sentences import listed, strategy_gloss
from drystone.report.tables_shown import Shown, row, shown
from drystone.report.verdict import ROW_SET_WORDS
from drystone.words import scales

LEVEL_WORDS = {"study": "Between studies", "row": "Between rows of a study"}


@dataclass(frozen=True)
class SideRow:
    """One strategy in the comparison; ``beside`` is the model-based interval where not the main."""

    strategy: str
    gloss: str
    row_set: str
    rows: str
    studies: str
    text: str
    df: str
    beside: str
    predicted: str
    bar: Bar | None
    bar_beside: Bar | None
    refused: str
    primary: bool


@dataclass(frozen=True)
class Sure:
    """Section 'How sure' of one analysis.

    ``two_kinds`` says that a model-based interval stands beside the main one, ``blanks`` why
    measures of heterogeneity are not given, where they are not.
    """

    model: str
    ticks: tuple[Tick, ...]
    zero: float
    sides: tuple[SideRow, ...]
    main_kind: str
    two_kinds: bool
    heterogeneity: Shown
    components: Shown
    blanks: str


def sure(facts: ReportFacts, analysis: AnalysisFacts) -> Sure | None:
    """Comparison of the overall effect over the strategies; None without an overall model."""
    model = next((main_model(s) for s in analysis.strategies if main_model(s)), None)
    if model is None:
        return None
    table = analysis.side_by_side[analysis.side_by_side["model"] == model.name]
    limits = [float(x) for name in ("estimate", "ci_low", "ci_high") for x in table[name]]
    scale = ratio_scale([], limits)
    two_kinds = facts.settings.inference.interval == scales.CLUSTER_ROBUST
    return Sure(
        model.name,
        scale.ticks(),
        scale.at(0.0),
        tuple(_side(record, analysis, scale, two_kinds) for record in records(table)),
        facts.settings.inference.interval.replace(" ", "-"),
        two_kinds,
        _heterogeneity(analysis, model.name),
        _components(analysis, model.name),
        _blanks(analysis, model.name),
    )


def _side(record: Record, analysis: AnalysisFacts, scale: RatioScale, two_kinds: bool) -> SideRow:
    strategy = analysis.strategy(str(record["strategy"]))
    model = strategy.model(str(record["model"])) if strategy is not None else None
    overall = model.overall() if model is not None else None
    get = partial(number_of, overall)
    ends = tuple(float(record[name]) for name in ("estimate", "ci_low", "ci_high"))
    beside = get("estimate"), get("ci_low_model"), get("ci_high_model")
    return SideRow(
        str(record["strategy"]),
        "" if strategy is None else strategy_gloss(strategy.settings),
        ROW_SET_WORDS.get(str(record["row_set"]), str(record["row_set"])),
        numbers.whole(record["rows"]),
        numbers.whole(record["studies"]),
        numbers.percent_with_interval(*ends),
        few_studies.marked(get("df")),
        numbers.percent_interval(*beside[1:]) if two_kinds else "",
        numbers.percent_interval(get("pi_low"), get("pi_high")),
        scale.bar(*ends),
        scale.bar(*beside) if two_kinds else None,
        record["refused"] if isinstance(record["refused"], str) else "",
        bool(record["primary"]),
    )


def _fitted(analysis: AnalysisFacts, name: str) -> list[tuple[StrategyFacts, ModelFacts]]:
    pairs = [(strategy, strategy.model(name)) for strategy in analysis.strategies]
    return [(s, model) for s, model in pairs if model is not None and not model.refused]


def _heterogeneity(analysis: AnalysisFacts, name: str) -> Shown:
    heads = (
        "Strategy", "#Q", "#df", "#p", "#I² in all", "#Typical sampling var.",
        "#CVH", "#M", "#Log-likelihood",
    )  # fmt: skip
    rows = []
    for strategy, model in _fitted(analysis, name):
        for item in records(model.heterogeneity):
            likelihood = float(model.coefficients["log_likelihood"].iloc[0])
            rows.append(
                row(
                    (
                        strategy.name,
                        numbers.number(item["q"]),
                        numbers.amount(item["q_df"]),
                        numbers.p_value(item["q_p"]),
                        numbers.share(item["i2_total"]),
                        numbers.number(item["typical_variance"]),
                        numbers.number(item["cvh"]),
                        numbers.number(item["m"]),
                        numbers.number(likelihood, 5),
                    )
                )
            )
    return shown("How much true effects differ, under each strategy", heads, rows)


def _blanks(analysis: AnalysisFacts, name: str) -> str:
    """Why Q and I2 are not there; the engine leaves them out only where V has no inverse."""
    blank = [
        strategy.name
        for strategy, model in _fitted(analysis, name)
        if model.heterogeneity["q"].isna().any()
    ]
    if not blank:
        return ""
    return (
        f"Under {listed(blank)}, Q and I² are {numbers.NOT_KNOWN}: some rows are perfectly "
        "correlated (they share both arms, or an arm without spread), so the sampling covariance "
        "has no inverse."
    )


def _components(analysis: AnalysisFacts, name: str) -> Shown:
    fitted = _fitted(analysis, name)
    levels = list(dict.fromkeys(level for _, m in fitted for level in m.components["level"]))
    heads = ("Strategy", *(f"#{LEVEL_WORDS.get(level, level)}" for level in levels))
    rows = []
    for strategy, model in fitted:
        by_level = {item["level"]: _component(item) for item in records(model.components)}
        rows.append(row((strategy.name, *(by_level.get(level, "") for level in levels))))
    return shown("Variance between true effects, on the log scale, by level", heads, rows)


def _component(item: Record) -> str:
    variance = "exactly 0" if item["at_zero"] else numbers.number(float(item["variance"]))
    return f"{variance} (I² {numbers.share(item['i2'])})"
