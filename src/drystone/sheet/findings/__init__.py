"""The findings: one small file per family, run in the order of ``STEPS``.

A step takes the draft and yields notes. It may fill in or blank values of the draft when the
finding says so. The order matters: a row that leaves is booked under the first step that stops it.

To add a finding, write a function in the file of its family, for example::

    def far_south(draft: Draft) -> Iterator[Note]:
        rows = where(draft.number("latitude") < -60)
        yield from draft.notes(
            levels.WARN, "far south", "latitude", rows,
            "the site lies in Antarctica", "check the sign of the latitude",
        )

and name it in ``STEPS``. Address, value as typed, ledger and display follow from that.
"""

from collections.abc import Callable, Iterable

from drystone.sheet.draft import Draft
from drystone.sheet.findings.answered import left_out_by_answer
from drystone.sheet.findings.arms import unlike_arms
from drystone.sheet.findings.bounds import impossible_sds, whole_numbers
from drystone.sheet.findings.cells import mixed_columns, read_cells
from drystone.sheet.findings.counts import check_counts
from drystone.sheet.findings.left_out import left_out_by_team, unknown_studies
from drystone.sheet.findings.lookalikes import chained_arms, shared_arms
from drystone.sheet.findings.meanings import direction, meaning_of_outcomes
from drystone.sheet.findings.means import check_means
from drystone.sheet.findings.normality import doubtful_normality
from drystone.sheet.findings.outcomes import check_outcomes, check_scales, check_units
from drystone.sheet.findings.ratios import far_ratios
from drystone.sheet.findings.repeats import equal_arms, repeated_rows, same_trial
from drystone.sheet.findings.replication import odd_counts
from drystone.sheet.findings.row_ids import check_row_ids
from drystone.sheet.findings.screens import screen_spreads
from drystone.sheet.findings.spreads import find_sds
from drystone.sheet.findings.sums import sums_of_outcomes
from drystone.sheet.findings.swaps import swapped_arms
from drystone.sheet.findings.time_and_baseline import (
    repeated_dates,
    spreads_without_kind,
    unused_baselines,
)
from drystone.sheet.findings.typed_marks import dates_for_names, digitised_precision
from drystone.sheet.findings.unused_spreads import unused_spreads
from drystone.sheet.findings.words import check_words, fill_defaults, unusual_meanings
from drystone.sheet.notes import Note

Step = Callable[[Draft], Iterable[Note]]

STEPS: tuple[Step, ...] = (
    read_cells,
    mixed_columns,
    check_row_ids,
    left_out_by_team,
    left_out_by_answer,
    unknown_studies,
    check_outcomes,
    check_scales,
    meaning_of_outcomes,
    direction,
    check_units,
    check_words,
    spreads_without_kind,
    fill_defaults,
    unusual_meanings,
    check_means,
    check_counts,
    find_sds,
    unused_spreads,
    unlike_arms,
    shared_arms,
    chained_arms,
    equal_arms,
    swapped_arms,
    repeated_rows,
    same_trial,
    sums_of_outcomes,
    odd_counts,
    repeated_dates,
    unused_baselines,
    impossible_sds,
    whole_numbers,
    far_ratios,
    screen_spreads,
    digitised_precision,
    dates_for_names,
    doubtful_normality,
)
