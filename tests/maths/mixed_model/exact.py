"""The restricted likelihood and CR2 at 50 digits: dense textbook formulas in mpmath.

The maximum is found by Newton steps on the score with the observed information, from the engine's
own answer; at 50 digits the steps end at the true root.
"""

from collections.abc import Iterable
from dataclasses import dataclass

import mpmath
import numpy as np
from mpmath import mp, mpf

from drystone.maths.mixed_model import Problem

DIGITS = 50


@dataclass(frozen=True)
class Exact:
    """REML quantities at 50 digits."""

    theta: list[mpf]
    score: list[mpf]
    coefficients: mpmath.matrix
    covariance: mpmath.matrix
    log_likelihood: mpf


def evaluate(problem: Problem, theta: list[mpf]) -> tuple[Exact, mpmath.matrix]:
    """REML log-likelihood, score, coefficients and observed information at theta."""
    V, G = _known(problem), _directions(problem)
    S = V.copy()
    for value, g in zip(theta, G, strict=True):
        S += value * g
    X, y = mpmath.matrix(problem.X.tolist()), mpmath.matrix(problem.y.tolist())
    W = mpmath.inverse(S)
    XWX = X.T * W * X
    M = mpmath.inverse(XWX)
    b = M * (X.T * W * y)
    r = y - X * b
    P = W - W * X * M * X.T * W
    u = P * y
    q = len(G)
    PG = [P * g for g in G]
    score = [(-_trace(PG[k]) + (u.T * G[k] * u)[0]) / 2 for k in range(q)]
    observed = mpmath.matrix(q, q)
    for k in range(q):
        for m in range(q):
            observed[k, m] = (u.T * G[k] * P * G[m] * u)[0] - _trace(PG[k] * PG[m]) / 2
    value = (len(y) - len(b)) * mpmath.log(2 * mpmath.pi) + mpmath.log(mpmath.det(S))
    value += mpmath.log(mpmath.det(XWX)) - mpmath.log(mpmath.det(X.T * X)) + (r.T * W * r)[0]
    return Exact(theta, score, b, M, -value / 2), observed


def maximum(problem: Problem, near: np.ndarray) -> Exact:
    """The REML maximum whose zeros are those of `near`."""
    with mp.workdps(DIGITS):
        free = [k for k, value in enumerate(near) if value > 0]
        theta = [mpf(float(value)) for value in near]
        for _ in range(60):
            here, observed = evaluate(problem, theta)
            if not free:
                return here
            step = mpmath.lu_solve(
                mpmath.matrix([[observed[k, m] for m in free] for k in free]),
                mpmath.matrix([here.score[k] for k in free]),
            )
            theta = list(theta)
            for place, k in enumerate(free):
                theta[k] += step[place]
            if max(abs(step[place] / theta[k]) for place, k in enumerate(free)) < mpf(10) ** -40:
                return evaluate(problem, theta)[0]
        raise ArithmeticError("no root at 50 digits")


def digits(found: float, exact: mpf) -> float:
    """Correct digits of `found`."""
    with mp.workdps(DIGITS):
        error = abs((mpf(float(found)) - exact) / exact)
        return 17.0 if error == 0 else float(-mpmath.log10(error))


def _trace(A: mpmath.matrix) -> mpf:
    return mpmath.fsum(A[k, k] for k in range(A.rows))


def _known(problem: Problem) -> mpmath.matrix:
    V = mpmath.diag([mpf(float(v)) for v in problem.known.variances])
    known = problem.known
    for i, j, value in zip(known.rows_i, known.rows_j, known.covariances, strict=True):
        V[int(i), int(j)] = V[int(j), int(i)] = mpf(float(value))
    return V


def _directions(problem: Problem) -> list[mpmath.matrix]:
    same = (problem.study[:, None] == problem.study[None, :]).astype(int)
    made = {"study": mpmath.matrix(same.tolist()), "row": mpmath.eye(len(problem.y))}
    return [made[name] for name in problem.term_names]


def cr2(
    problem: Problem, theta: list[mpf], clusters: np.ndarray | None = None
) -> tuple[mpmath.matrix, list[mpf]]:
    """CR2 covariance (by study by default) and Satterthwaite df of each coefficient, as defined."""
    with mp.workdps(DIGITS):
        Phi = _known(problem)
        for value, g in zip(theta, _directions(problem), strict=True):
            Phi += value * g
        X, y = mpmath.matrix(problem.X.tolist()), mpmath.matrix(problem.y.tolist())
        W = mpmath.inverse(Phi)
        M = mpmath.inverse(X.T * W * X)
        rest = mpmath.eye(len(y)) - X * M * X.T * W
        e = rest * y
        meat, levers = mpmath.zeros(X.cols), []
        codes = problem.study if clusters is None else clusters
        for code in np.unique(codes):
            j = [int(row) for row in np.flatnonzero(codes == code)]
            own = _block(Phi, j, j)
            Xj = _block(X, j, range(X.cols))
            D = mpmath.cholesky(own).T
            B = D * (own - Xj * M * Xj.T) * D.T
            half = Xj.T * _block(W, j, j) * D.T * _inverse_root(B) * D
            force = half * _block(e, j, [0])
            meat += force * force.T
            levers.append(_block(rest, j, range(len(y))).T * half.T * M)
        return M * meat * M, [_satterthwaite(levers, Phi, k) for k in range(X.cols)]


def _block(A: mpmath.matrix, rows: Iterable[int], columns: Iterable[int]) -> mpmath.matrix:
    chosen = list(columns)
    return mpmath.matrix([[A[i, j] for j in chosen] for i in rows])


def _inverse_root(B: mpmath.matrix) -> mpmath.matrix:
    values, axes = mpmath.eigsy(B)
    floor = max(values) * mpf(10) ** -35  # far below any true eigenvalue, far above rounding error
    roots = [1 / mpmath.sqrt(value) if value > floor else mpf(0) for value in values]
    return axes * mpmath.diag(roots) * axes.T


def _satterthwaite(levers: list[mpmath.matrix], Phi: mpmath.matrix, k: int) -> mpf:
    columns = [_block(lever, range(lever.rows), [k]) for lever in levers]
    products = [[(g.T * Phi * h)[0] for h in columns] for g in columns]
    trace = mpmath.fsum(products[j][j] for j in range(len(columns)))
    return trace**2 / mpmath.fsum(value**2 for row in products for value in row)
