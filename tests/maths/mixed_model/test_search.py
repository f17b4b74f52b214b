"""The search itself: hard places found by trying some thousand random problems."""

import numpy as np
import pytest
from maths.mixed_model import textbook

from drystone.maths.mixed_model import KnownCovariance, Problem, fit, prepare
from drystone.maths.mixed_model.criterion import evaluate
from drystone.maths.mixed_model.optimise import maximise


def _hard(seed: int, studies: int, decades: float, within: float) -> Problem:
    """Unlike variances and strong correlations of neighbours: likelihoods with two maxima."""
    random = np.random.default_rng(seed)
    study = np.repeat(np.arange(studies), 4)
    rows = len(study)
    v = 10.0 ** random.uniform(-decades, 0, rows) * 0.05
    y = np.sqrt(0.8) * random.normal(size=studies)[study]
    y += random.normal(size=rows) * np.sqrt(v + within)
    i = np.arange(0, rows, 4)
    known = KnownCovariance(v, i, i + 1, 0.999 * np.sqrt(v[i] * v[i + 1]))
    return Problem(y, np.ones((rows, 1)), ("overall",), study, known)


@pytest.mark.parametrize("seed", range(12))
def test_the_best_of_several_maxima_is_kept(seed):
    problem = _hard(seed, 8, 3.0, 0.0)
    prepared = prepare(problem)
    fitted = fit(prepared)
    grid = np.r_[0.0, np.geomspace(1e-8, 10.0, 19)]
    points = [evaluate(prepared, np.array([a, b]), "REML") for a in grid for b in grid]
    assert fitted.log_likelihood >= max(at.log_likelihood for at in points) - 1e-8
    assert fitted.log_likelihood == pytest.approx(
        textbook.log_likelihood(problem, fitted.theta, "REML"), rel=1e-9
    )


def test_disagreeing_starts_are_reported():
    # two rows with next to no sampling variance agree exactly: one maximum without a row level
    # for their sake, another one with a row level for the sake of the others
    random = np.random.default_rng(0)
    v = random.uniform(0.01, 0.1, 18)
    y = 0.5 * random.normal(size=18)
    v[:2], y[1] = 1e-12, y[0]
    study = np.repeat(np.arange(6), 3)
    fitted = fit(prepare(Problem(y, np.ones((18, 1)), ("overall",), study, KnownCovariance(v))))
    assert not fitted.certificate.starts_agree
    assert fitted.log_likelihood == max(fitted.certificate.ends)
    assert max(fitted.certificate.ends) - min(fitted.certificate.ends) > 0.1


@pytest.mark.parametrize("start", [(0.0, 0.0), (1e6, 1e6), (1e-14, 1e-14), (0.0, 5.0), (5.0, 0.0)])
@pytest.mark.parametrize("estimator", ["REML", "ML"])
def test_every_start_ends_at_a_maximum(start, estimator):
    for seed in range(4):
        prepared = prepare(_hard(seed, 6, 1.0, 0.1))
        path = maximise(prepared, estimator, np.array(start))
        best = fit(prepared, estimator)
        assert path.converged
        assert path.end.value == pytest.approx(best.log_likelihood, abs=1e-8)


def test_a_place_that_bends_upwards_is_left():
    """A held row level makes the likelihood convex in the study level at zero.

    The rows are those of seed 9447 of a random trial; from zero every short step gains less than
    the rounding error of the likelihood.
    """
    problem = _convex()
    held = np.array([False, True])
    prepared = prepare(problem)
    path = maximise(prepared, "ML", np.array([0.0, 2.4734713950743365e-09]), held)
    start = evaluate(prepared, np.array([0.0, 2.4734713950743365e-09]), "ML")
    assert path.converged
    assert path.end.at.theta[0] > 0.0
    assert path.end.value > start.log_likelihood + 1.0


def _convex() -> Problem:
    y = (
        "1.6388500245052888 1.5610069754918103 1.5301672391332553 1.5222477122881517 "
        "1.5560584115117617 1.5564227613245296 1.5336560268923702 1.7064418707431692 "
        "1.5559641374093764 1.550782803832374 1.5841415473979337 1.5587852664029183 "
        "1.5614850253554422 1.5598718155498619 1.5619996438744388 1.5648146283606421 "
        "1.5597934875185142 1.5622592276939844"
    )
    v = (
        "0.01050658540608869 7.213247436232396e-07 0.0002908123438930976 0.00888633732398806 "
        "5.078545757580381e-05 0.004507585489291136 0.0022351863408638472 0.00919294447195141 "
        "4.597029014065961e-05 0.00010760320898361667 0.00284595172245917 1.7133732968350185e-06 "
        "1.7008909180423785e-07 1.1435271120078196e-06 4.92305571475809e-07 0.002315953683843014 "
        "1.1866660271972034e-06 0.00013459295168645775"
    )
    covariances = [
        1.4468960186982998e-05,
        0.0006046075858017816,
        -3.491481664473969e-05,
        2.20511614169715e-07,
    ]
    study = np.repeat(np.arange(4), [6, 3, 5, 4])
    variances = np.array(v.split(), dtype=float)
    known = KnownCovariance(variances, [1, 3, 10, 12], [2, 4, 11, 13], covariances)
    return Problem(np.array(y.split(), dtype=float), np.ones((18, 1)), ("overall",), study, known)
