"""Why: the rows behind the numbers, the gaps, the averages that fill them, the moderators."""

from __future__ import annotations

import math
from dataclasses import dataclass

from drystone.report import numbers
from drystone.report.facts import (
    AnalysisFacts,
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
from drystone.report.moderators import moderator_tables
from drystone.report.sentences import listed
from drystone.report.spread import SpreadPicture, spread_pictures
from drystone.report.tables_shown import Row, Shown, row, shown


@dataclass(frozen=True)
class Why:
    """Section 'Why' of one analysis."""

    strategy: str
    fitted: bool
    ladder: Ladder
    reach: str
    gaps: tuple[GapStudy, ...]
    gap_counts: Shown
    spread: tuple[SpreadPicture, ...]
    averages: tuple[Shown, ...]
    moderators: tuple[Shown, ...]


def why(facts: ReportFacts, analysis: AnalysisFacts, links: Links) -> Why:
    """Section 'Why' of ``analysis``."""
    strategy = main_strategy(facts, analysis)
    model = main_model(strategy)
    ladder = build_ladder(facts, analysis, strategy, model, links)
    return Why(
        strategy.name,
        model is not None and not model.refused,
        ladder,
        numbers.number(ladder.times),
        gap_studies(analysis.slice, facts.studies, links.of(analysis)),
        _gap_table(analysis),
        spread_pictures(analysis.slice),
        tuple(_averages(group) for group in _groups(analysis)),
        tuple(moderator_tables(facts, analysis, strategy)),
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
