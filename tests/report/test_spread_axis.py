"""The logarithmic axes of mean against spread hold for absurd numbers too."""

from __future__ import annotations

from drystone.report.spread import _decades


def test_six_hundred_decades_have_few_labels_and_none_overflows():
    found = _decades(-310.0, 310.0)
    assert 5 <= len(found) <= 12
    assert all("e" in label for at, label in found if abs(at) > 10)


def test_narrow_range_has_round_labels():
    assert [label for _, label in _decades(0.0, 1.0)] == ["1", "2", "5", "10"]
