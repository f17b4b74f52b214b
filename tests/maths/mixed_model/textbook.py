"""The same quantities written out with dense matrices, straight from the textbook formulas.

Nothing here is shared with the engine but the statement of the problem.
"""

import numpy as np

from drystone.maths.mixed_model import Problem


def known_matrix(problem: Problem) -> np.ndarray:
    """V, shape (K, K), in the caller's row order."""
    known = problem.known
    V = np.diag(known.variances)
    V[known.rows_i, known.rows_j] = known.covariances
    V[known.rows_j, known.rows_i] = known.covariances
    return V


def directions(problem: Problem) -> list[np.ndarray]:
    """G_k = d Sigma / d theta_k of each level."""
    same = (problem.study[:, None] == problem.study[None, :]).astype(float)
    made = {"study": same, "row": np.eye(len(problem.y)), "scale": known_matrix(problem)}
    return [made[name] for name in problem.term_names]


def covariance(problem: Problem, theta: np.ndarray) -> np.ndarray:
    """Sigma at theta."""
    base = 0.0 if "scale" in problem.term_names else known_matrix(problem)
    return base + sum(t * G for t, G in zip(theta, directions(problem), strict=True))


def log_likelihood(problem: Problem, theta: np.ndarray, estimator: str) -> float:
    """Every constant kept; REML as in checks.json, meta.reml_loglik_convention."""
    X, y, S = problem.X, problem.y, covariance(problem, theta)
    b, _ = generalised_least_squares(problem, theta)
    r = y - X @ b
    p = X.shape[1] if estimator == "REML" else 0
    value = (len(y) - p) * np.log(2 * np.pi) + np.linalg.slogdet(S)[1] + r @ np.linalg.solve(S, r)
    if estimator == "REML":
        value += np.linalg.slogdet(X.T @ np.linalg.solve(S, X))[1]
        value -= np.linalg.slogdet(X.T @ X)[1]
    return -value / 2


def generalised_least_squares(problem: Problem, theta: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Coefficients and their model-based covariance."""
    W = np.linalg.inv(covariance(problem, theta))
    M = np.linalg.inv(problem.X.T @ W @ problem.X)
    return M @ problem.X.T @ W @ problem.y, M


def projection(problem: Problem, theta: np.ndarray) -> np.ndarray:
    """P = W - W X (X'WX)^-1 X'W."""
    W = np.linalg.inv(covariance(problem, theta))
    WX = W @ problem.X
    return W - WX @ np.linalg.solve(problem.X.T @ WX, WX.T)


def score_and_informations(
    problem: Problem, theta: np.ndarray, estimator: str
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Score, average and expected information."""
    P, y, G = projection(problem, theta), problem.y, directions(problem)
    T = P if estimator == "REML" else np.linalg.inv(covariance(problem, theta))
    score = [-np.trace(T @ g) / 2 + y @ P @ g @ P @ y / 2 for g in G]
    average = [[y @ P @ g @ P @ h @ P @ y / 2 for h in G] for g in G]
    expected = [[np.trace(T @ g @ T @ h) / 2 for h in G] for g in G]
    return np.array(score), np.array(average), np.array(expected)


def wishart_degrees(
    problem: Problem, theta: np.ndarray, contrasts: np.ndarray
) -> tuple[float, np.ndarray]:
    """Eta of Tipton & Pustejovsky 2015 by study, and the CR2 covariance, from the definition."""
    X, y, Phi = problem.X, problem.y, covariance(problem, theta)
    W = np.linalg.inv(Phi)
    M = np.linalg.inv(X.T @ W @ X)
    H = X @ M @ X.T @ W
    root = np.linalg.inv(np.linalg.cholesky(contrasts @ M @ contrasts.T))
    forces, meat = [], 0.0
    for code in np.unique(problem.study):
        j = np.flatnonzero(problem.study == code)
        D = np.linalg.cholesky(Phi[np.ix_(j, j)]).T
        values, axes = np.linalg.eigh(D @ (Phi[np.ix_(j, j)] - X[j] @ M @ X[j].T) @ D.T)
        A = D.T @ (axes / np.sqrt(values)) @ axes.T @ D
        lever = (np.eye(len(y)) - H)[j].T @ A @ W[np.ix_(j, j)] @ X[j] @ M
        forces.append(lever @ contrasts.T @ root.T)
        meat = meat + np.outer(lever.T @ y, lever.T @ y)
    q = len(contrasts)
    P = np.einsum("ias,ab,jbt->stij", np.array(forces), Phi, np.array(forces))
    total = sum((P[s, s] * P[t, t] + P[s, t] * P[t, s]).sum() for s in range(q) for t in range(q))
    return q * (q + 1) / total, meat
