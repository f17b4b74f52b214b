"""Why: the rows behind the numbers, the gaps, the averages that fill them, the moderators."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

from drystone.report import numbers
from drystone.report.facts import (
    AnalysisFacts,
    ModelFacts,
    Record,
    ReportFacts,
    StrategyFacts,
    main_model,
    main_strategy,
    records,
)
from drystone.report.gaps import GapStudy, gap_counts, gap_studies
from drystone.report.ladder import Ladder, build_ladder
from drystone.report.links import Links
from drystone.report.sentences import listed
from drystone.report.spread import SpreadPicture, spread_pictures
from drystone.report.tables_shown import Row, Shown, row, shown


@dataclass(frozen=True)
class Why:
    """Section 'Why' of one analysis."""

    strategy: str
    fitted: bool
    ladder: Ladder
    gaps: tuple[GapStudy, ...]
    gap_counts: Shown
    spread: tuple[SpreadPicture, ...]
    averages: tuple[Shown, ...]
    moderators: tuple[Shown, ...]


def why(facts: ReportFacts, analysis: AnalysisFacts, links: Links) -> Why:
    """Section 'Why' of ``analysis``."""
    strategy = main_strategy(facts, analysis)
    model = main_model(strategy)
    return Why(
        strategy.name,
        model is not None and not model.refused,
        build_ladder(facts, analysis, strategy, model, links),
        gap_studies(analysis.slice, facts.studies, links.of(analysis)),
        _gap_table(analysis),
        spread_pictures(analysis.slice),
        tuple(_averages(group) for group in _groups(analysis)),
        tuple(_moderator_tables(facts, analysis, strategy)),
    )


def _gap_table(analysis: AnalysisFacts) -> Shown:
    rows = [
        row(
            (
                item.outcome,
                item.arm,
                numbers.whole(item.arms),
                numbers.whole(item.arms - item.missing),
                numbers.whole(item.missing),
                numbers.share(item.missing / item.arms),
                numbers.whole(item.pooled),
            )
        )
        for item in gap_counts(analysis.slice)
    ]
    heads = ("Outcome", "Side", "#Arms", "#With SD", "#Without SD", "#Without", "#One SD for both")
    return shown("Physical arms with and without an SD; a shared arm counts once", heads, rows)


def _groups(analysis: AnalysisFacts) -> list[list[StrategyFacts]]:
    """Strategies that share one table of averages, together."""
    groups: list[list[StrategyFacts]] = []
    for strategy in analysis.strategies:
        same = [group for group in groups if group[0].averages.equals(strategy.averages)]
        if same:
            same[0].append(strategy)
        elif len(strategy.averages):
            groups.append([strategy])
    return groups


def _averages(group: list[StrategyFacts]) -> Shown:
    names = listed([f"'{strategy.name}'" for strategy in group])
    heads = (
        "Outcome", "Side", "How the average was taken", "#Average CV", "#Reporting arms",
        "#Largest share", "Arm with that share", "Note",
    )  # fmt: skip
    rows = [_average(item) for item in records(group[0].averages)]
    return shown(
        f"Averages of the coefficient of variation behind {names}; the versions that were plugged "
        "in are in bold",
        heads,
        rows,
    )


def _average(item: Record) -> Row:
    used = bool(item["used"])
    notes = ["plugged in"] * used + [numbers.typed(item["pooled_because"])]
    return row(
        (
            str(item["outcome"]),
            str(item["arm"]),
            str(item["version"]),
            numbers.number(math.sqrt(item["cv2"])),
            numbers.whole(item["reporting_arms"]),
            numbers.share(item["largest_share"]),
            numbers.typed(item["largest_arm"]),
            "; ".join(note for note in notes if note),
        ),
        strong=used,
    )


def _moderator_tables(
    facts: ReportFacts, analysis: AnalysisFacts, strategy: StrategyFacts
) -> Iterator[Shown]:
    for model in strategy.models:
        if not model.is_overall and not model.refused:
            yield _coefficients(facts, strategy, model)
            yield _across(analysis, model)


def _coefficients(facts: ReportFacts, strategy: StrategyFacts, model: ModelFacts) -> Shown:
    level = numbers.level_percent(facts.settings.inference.confidence_percent)
    heads = (
        "Coefficient", "#As percent (interval)", "#Log scale", f"#{level} interval", "#SE", "#df",
        "#p", "#Model-based interval",
    )  # fmt: skip
    rows = [
        row(
            (
                str(item["coefficient"]),
                numbers.percent_with_interval(item["estimate"], item["ci_low"], item["ci_high"]),
                numbers.number(item["estimate"]),
                numbers.number_interval(item["ci_low"], item["ci_high"]),
                numbers.number(item["se"]),
                numbers.number(item["df"]),
                numbers.p_value(item["p"]),
                numbers.number_interval(item["ci_low_model"], item["ci_high_model"]),
            )
        )
        for item in records(model.coefficients)
    ]
    first = model.coefficients.iloc[0]
    size = f"{numbers.count(int(first['rows']), 'row')} of " + numbers.count(
        int(first["studies"]), "study", "studies"
    )
    explained = "".join(
        f" R² marginal {numbers.share(item['r2_marginal'])}, conditional "
        f"{numbers.share(item['r2_conditional'])}."
        for item in records(model.heterogeneity)
    )
    return shown(
        f"Model '{model.name}', {model.formula}, under '{strategy.name}': {size}.{explained} A "
        "coefficient is a difference on the log scale; as percent it multiplies the ratio.",
        heads,
        rows,
    )


def _across(analysis: AnalysisFacts, model: ModelFacts) -> Shown:
    table = analysis.side_by_side[analysis.side_by_side["model"] == model.name]
    names = list(dict.fromkeys(table["strategy"]))
    cells: dict[tuple[str, str], str] = {}
    refused = {item["strategy"] for item in records(table) if isinstance(item["refused"], str)}
    for item in records(table):
        text = numbers.percent_with_interval(item["estimate"], item["ci_low"], item["ci_high"])
        cells[item["coefficient"], item["strategy"]] = text
    wanted = [str(name) for name in model.coefficients["coefficient"]]
    rows = [
        row((name, *("refused" if s in refused else cells.get((name, s), "") for s in names)))
        for name in wanted
    ]
    return shown(
        f"Model '{model.name}' over the strategies, as percent",
        ("Coefficient", *(f"#{name}" for name in names)),
        rows,
    )
