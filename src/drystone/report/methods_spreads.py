"""The methods in words, second part: what was done about missing spreads."""

from __future__ import annotations

from drystone.maths.average_variation import FEWEST_ARMS
from drystone.report import numbers
from drystone.report.facts import ReportFacts, StrategyFacts, records
from drystone.settings.model import Strategy
from drystone.words import strategies

READ_FROM_ANOTHER_ROW = "read from another row"  # rule of such an SD in the derivations
BOTH = "both"


def spreads(facts: ReportFacts) -> str:
    """What happened to the spreads of the sheet before any strategy; blank when nothing did."""
    rules = facts.derivations["rule"]
    borrowed = int((rules == READ_FROM_ANOTHER_ROW).sum())
    converted = len(rules) - borrowed
    parts = []
    if converted:
        was = "was" if converted == 1 else "were"
        parts.append(
            f"{numbers.count(converted, 'SD')} {was} computed from a spread that was reported as "
            "something else."
        )
    if borrowed:
        was = "was" if borrowed == 1 else "were"
        parts.append(
            f"{numbers.count(borrowed, 'blank SD')} {was} read from another row in which the same "
            "physical arm reports one."
        )
    if parts:
        parts.append("Each is listed under Derivations.")
    return " ".join(parts)


def main_strategy_words(facts: ReportFacts) -> str:
    """Which strategy leads, and who said so."""
    name = facts.settings.primary
    if "primary" in facts.settings.model_fields_set:
        why = "declared as primary in the config"
    else:
        why = "by default, since the config declares no primary strategy"
    return (
        f"'{name}' is the main strategy, {why}: the first screen speaks about it. The others stand "
        "beside it."
    )


def strategy_words(strategy: Strategy, declared: bool) -> str:
    """What one strategy does."""
    text = {
        strategies.COMPLETE_CASES: "Only rows in which both arms have an SD; each arm uses its own "
        "CV.",
        strategies.MISSING_CASES: "All usable rows. An arm with an SD uses its own CV; an arm "
        "without one borrows the average CV.",
        strategies.ALL_CASES: "Every arm uses the average CV, whether it reports an SD or not, in "
        "the variance and in the correction of the effect.",
    }[strategy.use]
    if strategy.rows == strategies.COMPLETE_ROWS and strategy.use != strategies.COMPLETE_CASES:
        text += (
            " Restricted to rows in which both arms have an SD, so that the effect of the weights "
            "can be told from the effect of the rows. The average is still that of all reporting "
            "arms of the analysis, those of the other rows included."
        )
    if not declared:
        text += " Not declared in the config: it stands beside its strategy by itself."
    if strategy.use == strategies.COMPLETE_CASES:
        return text
    return f"{text} {_reading(strategy)}"


def _reading(strategy: Strategy) -> str:
    reading = {
        strategies.SQUARE_OF_MEAN: "the square of the n-weighted mean CV",
        strategies.MEAN_OF_SQUARES: "the n-weighted mean of the squared CVs",
    }[strategy.average_cv]
    over = (
        "separately for control and treatment arms of each outcome"
        if strategy.average_over == strategies.BY_ARM
        else "over control and treatment arms of each outcome together"
    )
    return f"The average is {reading}, taken {over}."


def average_words(facts: ReportFacts) -> str:
    """How averages were taken, and what happened where few arms report."""
    if not borrows(facts):
        return "No strategy borrowed an average CV."
    by_arm = [s for s in facts.settings.strategies if _by_arm(s)]
    text = (
        "Each physical arm counts once in an average, however many rows use it. Borrowing is per "
        "physical arm: an arm has one CV in every row, variance, covariance and correction. An "
        f"average with fewer than {_word(FEWEST_ARMS)} reporting arms is pooled over the outcomes "
        "of its analysis where several report"
    )
    if by_arm:
        text += (
            ", never over control and treatment arms, since that would lose what averages by arm "
            "are for; with one outcome it stays as it is. An arm that serves as control in some "
            "rows and as treatment in others takes one CV, that of the role in which it stands in "
            "more rows (control when equal). SDs that are one value for both arms stay out of "
            "averages by arm; where they are the majority, the average is over both arms."
        )
    else:
        text += "; with one outcome it stays as it is."
    return " ".join([text, *_happened(facts)])


def borrows(facts: ReportFacts) -> bool:
    """Whether a strategy of the run plugs an average CV in."""
    return any(s.use != strategies.COMPLETE_CASES for s in facts.settings.strategies)


def _by_arm(strategy: Strategy) -> bool:
    borrowing = strategy.use != strategies.COMPLETE_CASES
    return borrowing and strategy.average_over == strategies.BY_ARM


def _happened(facts: ReportFacts) -> list[str]:
    """Averages by arm that had to be taken over both arms after all, by analysis."""
    found = []
    for analysis in facts.analyses:
        made = [s for s in analysis.strategies if _by_arm(s.settings) and _over_both(s)]
        if made:
            reasons = list(dict.fromkeys(text for s in made for text in _over_both(s)))
            found.append(
                f"In {analysis.name} an average by arm could not be taken and is over both arms: "
                f"{'; '.join(reasons)}."
            )
    return found


def _over_both(strategy: StrategyFacts) -> list[str]:
    both = strategy.averages[strategy.averages["arm"] == BOTH]
    return [_because(item["pooled_because"]) for item in records(both)]


def _because(reason: object) -> str:
    if isinstance(reason, str) and reason.startswith("no "):
        return reason
    return "most SDs are one value for both arms"


def _word(number: int) -> str:
    return {10: "ten"}.get(number, str(number))
