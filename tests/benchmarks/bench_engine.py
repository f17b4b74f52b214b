"""Ratios of running times of the likelihood engine, all taken in one run.

Run with one linear-algebra thread: OPENBLAS_NUM_THREADS=1 python tests/benchmarks/bench_engine.py
"""

import time
from collections.abc import Callable

import numpy as np
from scipy.linalg import cho_solve

from drystone.maths.mixed_model import KnownCovariance, Problem, cluster_robust, fit, prepare
from drystone.maths.mixed_model.criterion import evaluate
from drystone.maths.mixed_model.derivatives import slope

SIZE = 5


def invented(rows: int, *, shared: bool = False, size: int = SIZE) -> Problem:
    """Studies of `size` rows, one moderator; with `shared`, all rows of a study share a control."""
    random = np.random.default_rng(20)
    study = np.arange(rows) // size
    v = random.uniform(0.02, 0.2, rows)
    y = 0.2 + 0.3 * random.normal(size=study[-1] + 1)[study]
    y += random.normal(size=rows) * np.sqrt(v + 0.05)
    X = np.column_stack([np.ones(rows), random.normal(size=rows)])
    i = j = np.empty(0, dtype=int)
    if shared:
        first, second = np.triu_indices(size, 1)
        begin = np.arange(0, rows, size)[:, None]
        i, j = (begin + first).ravel(), (begin + second).ravel()
    common = np.full(len(i), 0.01)
    return Problem(y, X, ("overall", "slope"), study, KnownCovariance(v, i, j, common))


def seconds(act: Callable[[], object], repeats: int = 7) -> float:
    """Shortest of several runs."""
    taken = []
    for _ in range(repeats):
        begin = time.perf_counter()
        act()
        taken.append(time.perf_counter() - begin)
    return min(taken)


def dense_likelihood(problem: Problem, theta: np.ndarray) -> Callable[[], float]:
    """The restricted log-likelihood by one Cholesky factor of Sigma, matrices built beforehand."""
    same = (problem.study[:, None] == problem.study[None, :]).astype(float)
    V = np.diag(problem.known.variances)
    V[problem.known.rows_i, problem.known.rows_j] = problem.known.covariances
    V[problem.known.rows_j, problem.known.rows_i] = problem.known.covariances
    X, y, unit = problem.X, problem.y, np.eye(len(problem.y))

    def act() -> float:
        root = np.linalg.cholesky(V + theta[0] * same + theta[1] * unit)
        inner = cho_solve((root, True), np.column_stack([X, y]), check_finite=False)
        A = X.T @ inner[:, :-1]
        b = np.linalg.solve(A, X.T @ inner[:, -1])
        quadratic = (y - X @ b) @ (inner[:, -1] - inner[:, :-1] @ b)
        return -np.log(np.diag(root)).sum() - np.linalg.slogdet(A)[1] / 2 - quadratic / 2

    return act


def main() -> None:
    """Print every ratio with its target."""
    fits = {}
    for rows in (100, 1_000, 10_000, 100_000):
        prepared = prepare(invented(rows))
        fitted = fit(prepared)
        fits[rows] = seconds(lambda p=prepared: fit(p))
        robust = seconds(lambda p=prepared, f=fitted: cluster_robust(p, f), 3)
        setup = seconds(lambda r=rows: prepare(invented(r)), 3)
        print(
            f"K = {rows:6d}: fit {fits[rows] * 1e3:8.2f} ms "
            f"({fitted.certificate.starts} starts, {fitted.certificate.iterations} steps), "
            f"setup {setup * 1e3:7.2f} ms, CR2 {robust * 1e3:7.2f} ms"
        )
    print(f"fit, K = 100 000 / K = 10 000: {fits[100_000] / fits[10_000]:.1f}  (target <= 14)")

    for shared in (False, True):
        problem = invented(1_000, shared=shared)
        prepared, theta = prepare(problem), np.array([0.09, 0.05])
        ours = seconds(lambda p=prepared, t=theta: evaluate(p, t, "REML"), 50)
        at = evaluate(prepared, theta, "REML")
        both = ours + seconds(lambda p=prepared, a=at: slope(p, a, "REML"), 50)
        dense = seconds(dense_likelihood(problem, theta))
        print(
            f"K = 1 000, shared controls {shared}: dense Cholesky / evaluation "
            f"{dense / ours:.0f} (target >= 50), with score and information {dense / both:.0f}"
        )

    for rows in (1_000, 10_000):
        plain, linked = prepare(invented(rows)), prepare(invented(rows, shared=True))
        ratio = seconds(lambda p=linked: fit(p)) / seconds(lambda p=plain: fit(p))
        print(f"K = {rows}: shared-control fit / diagonal fit {ratio:.2f}  (target <= 1.5)")

    for size in (100, 500, 2_000):
        prepared = prepare(invented(10_000, size=size))
        fitted = fit(prepared)
        taken = seconds(lambda p=prepared, f=fitted: cluster_robust(p, f), 1)
        print(f"CR2, K = 10 000 in studies of {size}: {taken:.2f} s")


if __name__ == "__main__":
    main()
