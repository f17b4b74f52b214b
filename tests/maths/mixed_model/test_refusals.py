"""Every model that cannot be fitted is refused with a reason, a sentence and the facts."""

import pickle
from dataclasses import replace

import numpy as np
import pytest

from drystone.maths.mixed_model import (
    KnownCovariance,
    Problem,
    Refusal,
    Term,
    cluster_robust,
    fit,
    model_based,
    prediction_interval,
    prepare,
    study_effects,
)
from drystone.maths.mixed_model.identify import check_identified
from drystone.maths.mixed_model.refuse import InvalidProblemError

STUDY = np.array([0, 0, 0, 1, 1, 2, 2, 3])
Y = np.array([0.1, 0.4, 0.2, 0.7, 0.9, -0.3, 0.1, 0.5])


def _problem(**changes):
    parts = {
        "y": Y,
        "X": np.ones((len(Y), 1)),
        "coefficient_names": ("overall",),
        "study": STUDY,
        "known": KnownCovariance(np.full(len(Y), 0.04)),
        "terms": ("study", "row"),
    }
    return Problem(**{**parts, **changes})


def _refused(act) -> Refusal:
    with pytest.raises(Refusal) as caught:
        act()
    return caught.value


@pytest.mark.parametrize(("value", "place"), [(np.nan, 3), (np.inf, 5)])
def test_values_that_are_not_numbers(value, place):
    y = Y.copy()
    y[place] = value
    refusal = _refused(lambda: _problem(y=y))
    assert refusal.reason == "non_finite_input"
    assert refusal.facts == {"array": "y", "rows": [place]}
    assert f"row {place}" in str(refusal)


@pytest.mark.parametrize("variance", [0.0, -0.1])
def test_variances_that_are_not_positive(variance):
    refusal = _refused(lambda: KnownCovariance(np.array([0.1, variance, 0.1])))
    assert refusal.reason == "non_positive_variance"
    assert refusal.facts["rows"] == [1]


def test_no_more_rows_than_coefficients():
    X = np.random.default_rng(1).normal(size=(8, 8))
    problem = _problem(X=X, coefficient_names=tuple("abcdefgh"), terms=("row",))
    assert _refused(lambda: prepare(problem)).reason == "too_few_rows"


def test_one_row_is_said_in_the_singular():
    one = {"y": Y[:1], "X": np.ones((1, 1)), "study": STUDY[:1]}
    problem = _problem(**one, known=KnownCovariance(np.full(1, 0.04)), terms=("row",))
    refusal = _refused(lambda: prepare(problem))
    assert str(refusal) == "1 row cannot carry 1 coefficient and a variance."


def test_no_more_studies_than_coefficients():
    X = np.random.default_rng(1).normal(size=(8, 4))
    refusal = _refused(lambda: prepare(_problem(X=X, coefficient_names=tuple("abcd"))))
    assert refusal.reason == "too_few_studies"
    assert refusal.facts == {"studies": 4, "coefficients": 4}
    assert "4 studies cannot carry 4 coefficients" in str(refusal)


def test_no_t_test_without_degrees_of_freedom():
    X = np.random.default_rng(1).normal(size=(8, 4))
    problem = _problem(X=X, coefficient_names=tuple("abcd"), terms=("row",))
    assert _refused(lambda: model_based(fit(prepare(problem)))).reason == "too_few_studies"


def test_one_study_with_a_study_level():
    refusal = _refused(lambda: prepare(_problem(study=np.zeros(8, int))))
    assert refusal.reason == "single_study"


def test_one_study_without_a_study_level_is_fine():
    fitted = fit(prepare(_problem(study=np.zeros(8, int), terms=("row",))))
    assert fitted.studies == 1


def test_one_row_per_study():
    refusal = _refused(lambda: fit(prepare(_problem(study=np.arange(8)))))
    assert refusal.reason == "levels_indistinguishable"
    assert "one row per study" in str(refusal)
    assert set(refusal.facts["levels"]) == {"study", "row"}


@pytest.mark.parametrize("terms", [("study",), ("row",)])
def test_one_row_per_study_carries_one_level(terms):
    fitted = fit(prepare(_problem(study=np.arange(8), terms=terms)))
    assert fitted.certificate.converged


def test_equal_variances_cannot_tell_scale_from_row():
    refusal = _refused(lambda: fit(prepare(_problem(terms=("study", "row", "scale")))))
    assert refusal.reason == "levels_indistinguishable"
    assert set(refusal.facts["levels"]) == {"row", "scale"}


def test_coefficients_that_take_the_only_pair_of_rows():
    # both rows of the only study with two rows have a coefficient of their own
    X = np.column_stack([np.ones(6), np.eye(6)[:, 0], np.eye(6)[:, 1]])
    parts = {"y": Y[:6], "study": np.array([0, 0, 1, 2, 3, 4])}
    parts["known"] = KnownCovariance(np.full(6, 0.04))
    refusal = _refused(lambda: fit(prepare(_problem(X=X, coefficient_names=tuple("abc"), **parts))))
    assert refusal.reason == "levels_indistinguishable"
    assert "coefficients leave free" in str(refusal)
    # with one coefficient for the difference of the pair, its mean still tells the levels apart
    slope = np.column_stack([np.ones(6), [1.0, -1.0, 0, 0, 0, 0]])
    fitted = fit(prepare(_problem(X=slope, coefficient_names=tuple("ab"), **parts)))
    assert fitted.certificate.converged


def test_a_level_that_the_coefficients_absorb():
    # a coefficient per study; the level is put in after the count of studies was checked
    dummies = (STUDY[:, None] == np.arange(4)).astype(float)
    plain = prepare(_problem(X=dummies, coefficient_names=tuple("abcd"), terms=("row",)))
    problem = replace(plain.problem, terms=(Term("study"), Term("row")))
    refusal = _refused(lambda: check_identified(replace(plain, problem=problem)))
    assert refusal.reason == "flat_likelihood"
    assert refusal.facts["levels"] == ["study"]


def test_columns_that_depend_on_each_other_are_named():
    random = np.random.default_rng(2).normal(size=8)
    X = np.column_stack([np.ones(8), random, 2 * random - 3, np.arange(8.0)])
    names = ("overall", "rain", "rain again", "year")
    refusal = _refused(lambda: prepare(_problem(X=X, coefficient_names=names, terms=("row",))))
    assert refusal.reason == "rank_deficient_design"
    assert refusal.facts["columns"] == ["overall", "rain", "rain again"]


def test_an_empty_column_is_named():
    X = np.column_stack([np.ones(8), np.zeros(8)])
    refusal = _refused(lambda: prepare(_problem(X=X, coefficient_names=("overall", "forest"))))
    assert refusal.reason == "rank_deficient_design"
    assert refusal.facts["columns"] == ["forest"]


def test_a_pair_that_breaks_the_known_covariance_is_named():
    known = KnownCovariance(np.full(8, 0.04), [0, 3], [1, 4], [0.01, 0.05])
    refusal = _refused(lambda: prepare(_problem(known=known)))
    assert refusal.reason == "known_covariance_not_positive_definite"
    assert refusal.facts["rows"] == (3, 4)
    assert refusal.facts["smallest_eigenvalue"] == pytest.approx(-0.01, rel=1e-12)


def test_a_borrowed_control_that_breaks_the_known_covariance():
    # control with its own CV .8 at n 4, borrowed as .2 in the third row: the smallest eigenvalue
    # is negative although every pair alone is possible
    shared = 0.8**2 / 4
    v = np.array([shared + 0.01, shared + 0.01, 0.2**2 / 4 + 0.1, 0.1, 0.1])
    known = KnownCovariance(v, [0, 0, 1], [1, 2, 2], [shared, shared - 0.02, shared - 0.02])
    problem = _problem(
        y=Y[:5], X=np.ones((5, 1)), study=np.array([0, 0, 0, 1, 1]), known=known, terms=("row",)
    )
    V = np.diag(v)
    V[[0, 0, 1, 1, 2, 2], [1, 2, 0, 2, 0, 1]] = np.array([shared, shared - 0.02] * 3)[
        [0, 1, 0, 1, 1, 1]
    ]
    refusal = _refused(lambda: prepare(problem))
    assert refusal.reason == "known_covariance_not_positive_definite"
    expected = np.linalg.eigvalsh(V)[0]
    assert expected < 0
    assert refusal.facts["smallest_eigenvalue"] == pytest.approx(expected, rel=1e-9)


def test_perfectly_correlated_rows_need_a_row_level():
    known = KnownCovariance(np.full(8, 0.04), [0], [1], [0.04])
    alone = _refused(lambda: fit(prepare(_problem(known=known, terms=("study",)))))
    assert alone.reason == "singular_covariance"
    fitted = fit(prepare(_problem(known=known)))
    assert fitted.components["row"] > 0


def test_perfectly_correlated_equal_rows_make_the_likelihood_unbounded():
    known = KnownCovariance(np.full(8, 0.04), [0], [1], [0.04])
    y = Y.copy()
    y[1] = y[0]
    refusal = _refused(lambda: fit(prepare(_problem(y=y, known=known, terms=("row",)))))
    assert refusal.reason == "singular_covariance"
    assert refusal.facts["rows"] == [0, 1]


@pytest.mark.parametrize(
    "term", ["species", Term("phylogeny", np.arange(8), np.eye(8)), Term("row", None, np.eye(8))]
)
def test_levels_that_do_not_exist_yet(term):
    assert _refused(lambda: _problem(terms=(term,))).reason == "unsupported_term"


@pytest.mark.parametrize(
    "changes",
    [
        {"y": Y[:7]},
        {"X": np.ones(8)},
        {"coefficient_names": ("a", "b")},
        {"study": STUDY + 0.5},
        {"terms": ("row", "row")},
        {"y": np.empty(0), "X": np.empty((0, 1)), "study": np.empty(0, int)},
        {"known": KnownCovariance(np.full(8, 0.04), [0], [7], [0.01])},
    ],
)
def test_arrays_that_do_not_belong_together(changes):
    if len(changes.get("y", Y)) == 0:
        changes = {**changes, "known": KnownCovariance(np.empty(0))}
    with pytest.raises(InvalidProblemError):
        _problem(**changes)


@pytest.mark.parametrize(
    ("i", "j"), [([0], [0]), ([0, 1], [1, 0]), ([0], [9]), ([-1], [1]), ([0, 1], [2])]
)
def test_covariances_that_name_no_pair(i, j):
    with pytest.raises(InvalidProblemError):
        KnownCovariance(np.full(3, 0.04), i, j, np.full(len(i), 0.01))


def test_clusters_that_cut_studies():
    prepared = prepare(_problem())
    refusal = _refused(lambda: cluster_robust(prepared, fit(prepared), np.arange(8)))
    assert refusal.reason == "clusters_cut_studies"


def test_rows_as_clusters_where_no_study_level_links_them():
    prepared = prepare(_problem(terms=("row",)))
    assert cluster_robust(prepared, fit(prepared), np.arange(8)).clusters == 8
    known = KnownCovariance(np.full(8, 0.04), [0], [1], [0.02])
    linked = prepare(_problem(terms=("row",), known=known))
    refusal = _refused(lambda: cluster_robust(linked, fit(linked), np.arange(8)))
    assert refusal.reason == "clusters_cut_studies"


def test_one_cluster():
    prepared = prepare(_problem(terms=("row",)))
    refusal = _refused(lambda: cluster_robust(prepared, fit(prepared), np.zeros(8, int)))
    assert refusal.reason == "too_few_studies"


def test_questions_the_model_cannot_answer():
    prepared = prepare(_problem(terms=("row",)))
    fitted = fit(prepared)
    for act in (
        lambda: study_effects(prepared, fitted),
        lambda: prediction_interval(fitted, levels=["study"]),
        lambda: prediction_interval(fitted, [[1.0, 2.0]]),
        lambda: model_based(fitted, confidence_percent=100.0),
        lambda: fit(prepared, held={"study": 0.1}),
        lambda: fit(prepared, held={"row": -0.1}),
        lambda: fit(prepared, starts=[{"study": 0.1}]),
        lambda: fit(prepared, starts=[{"row": np.nan}]),
    ):
        assert _refused(act).reason == "invalid_problem"


def test_rows_that_all_lie_on_their_fitted_values():
    flat = _problem(y=np.full(8, 0.3))
    prepared = prepare(flat)
    fitted = fit(prepared)
    assert fitted.at_zero == {"study": True, "row": True}
    assert _refused(lambda: cluster_robust(prepared, fitted)).reason == "no_residuals"
    scaled = _problem(y=np.full(8, 0.3), terms=("scale",))
    assert _refused(lambda: fit(prepare(scaled))).reason == "singular_covariance"


def test_every_reason_is_its_own():
    kinds = Refusal.__subclasses__()
    assert len({kind.reason for kind in kinds} | {Refusal.reason}) == len(kinds) + 1


def test_a_refusal_survives_the_way_between_processes():
    refusal = _refused(lambda: prepare(_problem(study=np.zeros(8, int))))
    sent = pickle.loads(pickle.dumps(refusal))
    assert (sent.reason, str(sent), sent.facts) == (refusal.reason, str(refusal), refusal.facts)
