"""Warnings about the average CV: few arms behind it, one arm that owns it, versions apart."""

from __future__ import annotations

import math
from collections.abc import Iterator

import pandas as pd

from drystone.maths.average_variation import DOMINATING_SHARE, FEWEST_ARMS, SPREAD_OF_VERSIONS
from drystone.report import numbers
from drystone.report.facts import AnalysisFacts, Record, ReportFacts, StrategyFacts, records
from drystone.report.sentences import listed
from drystone.words import arms

BOTH = "both"
ALL_OUTCOMES = "all outcomes"
MEDIAN = "square of median"


def average_cautions(
    facts: ReportFacts, analysis: AnalysisFacts, main: StrategyFacts
) -> Iterator[str]:
    """Warnings about averages that stand behind a number on the page, the gravest first."""
    yield from _few_arms(analysis, main)
    yield from _dominating_arms(facts, analysis, main)
    yield from _versions_apart(analysis, main)


def averages_in_use(analysis: AnalysisFacts, strategy: StrategyFacts) -> list[Record]:
    """Averages, in the reading of ``strategy``, that at least one of its rows borrows."""
    table = strategy.averages
    borrowing = _borrowing(analysis, strategy)
    return [
        item
        for item in records(table[table["used"].astype(bool)])
        if any(_serves(item, outcome, role) for outcome, role in borrowing)
    ]


def _borrowing(analysis: AnalysisFacts, strategy: StrategyFacts) -> set[tuple[str, str]]:
    """Outcomes and roles in which an arm borrows.

    An arm that stands in both roles may borrow under either, so both are named.
    """
    sampling = strategy.sampling.set_index("row_id")
    rows = analysis.slice[analysis.slice["row_id"].isin(sampling.index)]
    in_both = set(rows["control_arm"]) & set(rows["treatment_arm"])
    found = set()
    for role in arms.ARMS:
        borrows = rows["row_id"].map(sampling[f"{role}_cv_source"]) == "average"
        part = rows[borrows]
        found |= {(str(outcome), role) for outcome in part["outcome"]}
        chained = part[part[f"{role}_arm"].isin(in_both)]
        found |= {(str(outcome), either) for outcome in chained["outcome"] for either in arms.ARMS}
    return found


def _serves(item: Record, outcome: str, role: str) -> bool:
    return item["arm"] in (BOTH, role) and item["outcome"] in (ALL_OUTCOMES, outcome)


def _few_arms(analysis: AnalysisFacts, main: StrategyFacts) -> Iterator[str]:
    for item in averages_in_use(analysis, main):
        count = int(item["reporting_arms"])
        if count < FEWEST_ARMS:
            yield (
                f"The average CV of {_whose(item)}, which {main.name} uses, rests on "
                f"{numbers.count(count, 'arm')} that {'reports' if count == 1 else 'report'} an "
                "SD, fewer than ten: it is a rough stand-in."
            )


def _dominating_arms(
    facts: ReportFacts, analysis: AnalysisFacts, main: StrategyFacts
) -> Iterator[str]:
    """One sentence for each arm that owns an average, from the main strategy where that uses it."""
    declared = {strategy.name for strategy in facts.settings.strategies}
    others = [s for s in analysis.strategies if s.name in declared and s.name != main.name]
    found: dict[tuple[str, str, str], tuple[Record, list[StrategyFacts]]] = {}
    for strategy in (main, *others):
        for item in averages_in_use(analysis, strategy):
            if not _dominated(item):
                continue
            key = str(item["outcome"]), str(item["arm"]), str(item["largest_arm"])
            first, using = found.setdefault(key, (item, []))
            if first["version"] == item["version"]:
                using.append(strategy)
    for item, using in found.values():
        yield _dominating(item, using)


def _dominated(item: Record) -> bool:
    heavy = float(item["largest_share"]) > DOMINATING_SHARE
    return heavy and int(item["reporting_arms"]) >= FEWEST_ARMS


def _dominating(item: Record, using: list[StrategyFacts]) -> str:
    text = (
        f"One arm owns {numbers.share(item['largest_share'])} of the average CV of {_whose(item)} "
        f"under {listed([s.name for s in using])} (reading: {item['version']}): "
        f"{numbers.typed(item['largest_arm'])}. Ways out: mend this arm in the sheet if it is "
        "wrong; see in the table of averages under Why what the other versions give"
    )
    median = _median(using[0].averages, item)
    if not math.isnan(median):
        text += (
            f", for example the median, which no arm owns (CV {numbers.number(median)} instead of "
            f"{numbers.number(math.sqrt(item['cv2']))})"
        )
    if item["arm"] != BOTH:
        text += (
            "; or average over both arms (average_over: both arms), which gives up the difference "
            "between them"
        )
    return f"{text}."


def _median(averages: pd.DataFrame, item: Record) -> float:
    same = (averages["outcome"] == item["outcome"]) & (averages["arm"] == item["arm"])
    found = averages.loc[same & (averages["version"] == MEDIAN), "cv2"]
    return math.sqrt(float(found.iloc[0])) if len(found) else math.nan


def _versions_apart(analysis: AnalysisFacts, main: StrategyFacts) -> Iterator[str]:
    factors = {}
    table = main.averages
    for item in averages_in_use(analysis, main):
        part = table[(table["outcome"] == item["outcome"]) & (table["arm"] == item["arm"])]
        low, high = float(part["cv2"].min()), float(part["cv2"].max())
        if low > 0 and high / low > SPREAD_OF_VERSIONS:
            factors[_whose(item)] = high / low
    if factors:
        where = "; ".join(f"{key}: {numbers.number(x, 2)}" for key, x in factors.items())
        yield (
            f"Versions of the average squared CV differ by more than a factor of "
            f"{SPREAD_OF_VERSIONS:g} ({where}), so the reading of the average matters; they stand "
            "side by side under Why."
        )


def _whose(item: Record) -> str:
    role = "control and treatment arms together" if item["arm"] == BOTH else f"{item['arm']} arms"
    return f"{role} ({item['outcome']})"
