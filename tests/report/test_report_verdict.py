"""Verdicts for every way in which strategies can agree or not. Invented estimates."""

from __future__ import annotations

import math
from dataclasses import replace

from report.invented_facts import invented_facts
from test_report_numbers import plain

from drystone.report.found import found
from drystone.report.verdict import FACTOR_WORDS, StrategyEstimate, estimates_of, verdict

NAN = math.nan


def estimate(name: str, middle: float, half: float = 0.05) -> StrategyEstimate:
    return StrategyEstimate(name, middle, middle - half, middle + half)


REFUSED = StrategyEstimate("C", NAN, NAN, NAN, refused="too few studies")


def said(*items: StrategyEstimate) -> tuple[bool | None, str]:
    answer = verdict(items, 95.0)
    return answer.holds, plain(" ".join(answer.sentences))


def test_all_agree() -> None:
    holds, text = said(estimate("A", 0.10), estimate("B", 0.12))
    assert holds is True
    assert text == (
        "Sign, interval and size hold over the 2 strategies. Every estimate is positive. "
        "Every 95 % interval excludes zero. Estimates run from +11 % to +13 %. Sizes count as "
        "equal up to a factor of 1.5 on the log scale (common practice, no source)."
    )


def test_all_agree_that_nothing_is_settled() -> None:
    holds, text = said(estimate("A", 0.040), estimate("B", 0.041))
    assert holds is True
    assert "Every 95 % interval includes zero." in text


def test_sign_flips() -> None:
    holds, text = said(estimate("A", 0.1), estimate("B", -0.1), estimate("C", 0.12))
    assert holds is False
    assert text.startswith("The sign does not hold: positive under A and C; negative under B.")


def test_interval_excludes_zero_under_some_only() -> None:
    holds, text = said(estimate("A", 0.06), estimate("B", 0.06, half=0.2))
    assert holds is False
    assert text.startswith(
        "Whether the 95 % interval excludes zero depends on the strategy: it does under A; it "
        "does not under B."
    )
    assert "Every estimate is positive." in text


def test_size_differs() -> None:
    holds, text = said(estimate("A", 0.2), estimate("B", 0.1))
    assert holds is False
    assert text.startswith(
        "The size does not hold: +22 % under A is 2.0 times the +11 % under B, measured on the "
        "log scale."
    )


def test_size_within_the_factor_holds() -> None:
    assert said(estimate("A", 0.149), estimate("B", 0.1))[0] is True
    assert said(estimate("A", 0.151), estimate("B", 0.1))[0] is False


def test_a_refused_strategy_is_named() -> None:
    holds, text = said(estimate("A", 0.1), estimate("B", 0.11), REFUSED)
    assert holds is True
    assert text.startswith("Sign, interval and size hold over the 2 of 3 strategies with a result.")
    assert text.endswith("No result under C: too few studies.")


def test_one_or_none_gives_no_verdict() -> None:
    assert said(estimate("A", 0.1), REFUSED)[0] is None
    assert said(REFUSED) == (
        None,
        "No strategy gave an overall effect. No result under C: too few studies.",
    )
    assert said()[0] is None


def test_zero_is_neither_positive_nor_negative() -> None:
    holds, text = said(estimate("A", 0.0), estimate("B", 0.1))
    assert holds is False
    assert "zero under A" in text


def test_refused_strategies_with_one_reason_are_named_together() -> None:
    text = said(estimate("A", 0.1), REFUSED, replace(REFUSED, strategy="D"))[1]
    assert "No result under C and D: too few studies." in text


def on(rows: int, name: str, middle: float, *, declared: bool = True) -> StrategyEstimate:
    row_set = "all usable rows" if rows == 90 else "rows with both SDs"
    return replace(estimate(name, middle), rows=rows, row_set=row_set, declared=declared)


def test_partners_that_the_config_does_not_name_are_not_counted() -> None:
    text = said(on(90, "A", 0.1), on(90, "B", 0.11), on(50, "A twin", 0.1, declared=False))[1]
    assert "over the 2 strategies" in text
    assert "twin" not in text


def test_a_refused_partner_is_no_refused_strategy() -> None:
    partner = replace(REFUSED, declared=False)
    assert "No result" not in said(estimate("A", 0.1), estimate("B", 0.11), partner)[1]


def test_sizes_are_compared_on_the_same_rows_first() -> None:
    # B on few rows is twice A on all rows, but so is A's partner on the few rows: it is the rows
    few, many = on(50, "B", 0.2), on(90, "A", 0.1)
    holds, text = said(many, few, on(50, "A on few", 0.19, declared=False))
    assert holds is False
    assert text.startswith(
        "The size does not hold between row sets: +22 % under B on rows with both SDs is 2.0 times "
        "the +11 % under A on all usable rows, measured on the log scale. No two"
    )
    text = said(many, on(90, "C", 0.11), few, on(50, "A on few", 0.19, declared=False))[1]
    assert "the size holds, so the rows make the difference." in text


def test_a_difference_on_the_same_rows_is_one_of_the_strategies() -> None:
    partner = on(50, "A on few", 0.1, declared=False)
    holds, text = said(on(90, "A", 0.11), on(50, "B", 0.2), partner)
    assert holds is False
    assert text.startswith("The size does not hold: +22 % under B is 2.0 times the +11 % under A")


def test_signs_that_differ_have_no_factor() -> None:
    partner = on(50, "A on few", -0.1, declared=False)
    text = said(on(90, "A", 0.11), on(50, "B", 0.12), partner)[1]
    assert "+13 % under B stands against -9.5 % under A on few." in text


def test_page_counts_the_strategies_of_the_config() -> None:
    facts = invented_facts(130)
    assert len(facts.settings.all_strategies()) == 4  # three declared, one partner beside them
    first = found(facts, facts.analyses[0]).verdict
    assert "over the 3 strategies" in plain(" ".join(first.sentences))
    assert FACTOR_WORDS in first.sentences
    table = facts.analyses[0].side_by_side
    made = estimates_of(table[table["model"] == "overall"], ["all cases"])
    assert [item.declared for item in made] == [False, False, True, False]
    assert made[0].rows == made[3].rows < made[1].rows
