"""Degrees of freedom of a cluster-robust covariance under the working model.

With g_sj the vector that turns y into the part of cluster j in contrast s, the covariance of two
parts is P_st(i, j) = g_si' Phi g_tj = [i = j] d_st(j) - t_si' M t_tj (own algebra), so that all
double sums over clusters are products of p x p matrices.
"""

from dataclasses import dataclass

import numpy as np

from drystone.maths.mixed_model.problem import Floats


@dataclass(frozen=True)
class Moments:
    """What the degrees of freedom rest on.

    Parameters
    ----------
    bread : array, shape (p, p)
        M, the model-based covariance.
    overlaps : array, shape (J, p, p)
        X' U of each cluster, which gives t.
    variances : array, shape (J, p, p)
        U' Phi U of each cluster, which gives d.
    """

    bread: Floats
    overlaps: Floats
    variances: Floats

    def own(self, one: Floats, other: Floats) -> Floats:
        """d_st of each cluster, shape (J,)."""
        made: Floats = np.einsum("a,jab,b->j", one, self.variances, other)
        return made

    def shared(self, one: Floats, other: Floats) -> Floats:
        """t_s' M t_t of each cluster, shape (J,)."""
        s, t = self.overlaps @ one, self.overlaps @ other
        made: Floats = np.einsum("ja,ab,jb->j", s, self.bread, t)
        return made


def satterthwaite(moments: Moments, row: Floats) -> float:
    """(sum P(j, j))^2 / sum P(i, j)^2 of one contrast (Bell & McCaffrey 2002)."""
    trace = (moments.own(row, row) - moments.shared(row, row)).sum()
    squares = 0.5 * variance_of_entry(moments, row, row)
    return float(trace**2 / squares) if squares > 0.0 else np.nan


def wishart_degrees(moments: Moments, rows: Floats) -> float:
    """Q (q + 1) over the total variance of the entries of the standardised covariance.

    Tipton & Pustejovsky 2015 (J Educ Behav Stat 40:604).
    """
    values, axes = np.linalg.eigh(rows @ moments.bread @ rows.T)
    standard = (axes / np.sqrt(values)).T @ rows
    total = sum(variance_of_entry(moments, s, t) for s in standard for t in standard)
    return len(rows) * (len(rows) + 1) / total


def variance_of_entry(moments: Moments, one: Floats, other: Floats) -> float:
    """Sum over clusters i, j of P_ss P_tt + P_st P_ts."""
    d_ss, d_tt, d_st = (moments.own(*pair) for pair in _pairs(one, other))
    c_ss, c_tt, c_st = (moments.shared(*pair) for pair in _pairs(one, other))
    s, t = moments.overlaps @ one, moments.overlaps @ other
    cross, turned = moments.bread @ (s.T @ t), moments.bread @ (t.T @ s)
    diagonal = d_ss @ d_tt - d_ss @ c_tt - d_tt @ c_ss + d_st @ d_st - 2.0 * d_st @ c_st
    return float(diagonal + np.trace(cross @ turned) + np.trace(turned @ turned))


def _pairs(one: Floats, other: Floats) -> tuple[tuple[Floats, Floats], ...]:
    return (one, one), (other, other), (one, other)
