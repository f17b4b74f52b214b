"""Studies whose rows say the same thing twice."""

from __future__ import annotations

import pandas as pd
import pytest

from drystone.report.study_summary import summarise_studies


def test_two_rows_that_are_perfectly_correlated_count_as_one():
    """V = [[.2, .2], [.2, .2]]: together they have one row's variance."""
    sampling = pd.DataFrame(
        {
            "row_id": ["a", "b"],
            "study": ["Place 1", "Place 1"],
            "effect": [0.3, 0.5],
            "sampling_variance": [0.2, 0.2],
        }
    )
    covariance = pd.DataFrame({"row_id": ["a"], "other_row_id": ["b"], "covariance": [0.2]})
    (summary,) = summarise_studies(sampling, covariance, 0.0)
    assert summary.mean == pytest.approx(0.4, rel=1e-12)
    assert summary.se == pytest.approx(0.2**0.5, rel=1e-12)
