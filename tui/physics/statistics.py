"""Chi-square tails, information criteria, Gaussian sigma of very small p."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import gammaincc, gammaln, ndtri_exp

from tui.model import FloatArray


def chi2_tail(chi2: ArrayLike, dof: ArrayLike) -> FloatArray:
    """Q(dof/2, chi2/2), the chance of a larger chi-square; NaN where dof <= 0."""
    dof = np.asarray(dof, dtype=np.float64)
    usable = np.where(dof > 0, dof, 1.0)
    return np.where(dof > 0, gammaincc(usable / 2, np.maximum(chi2, 0.0) / 2), np.nan)


def ln_chi2_tail(chi2: ArrayLike, dof: ArrayLike) -> FloatArray:
    """ln Q(dof/2, chi2/2), finite where Q itself is too small for a double.

    Beyond that it is the continued fraction of the incomplete gamma function (Abramowitz & Stegun 6.5.31).
    """
    a, x = np.broadcast_arrays(np.asarray(dof, float) / 2, np.maximum(np.asarray(chi2, float), 0.0) / 2)
    plain = gammaincc(a, x)
    far = plain < 1e-290
    if not far.any():
        return np.log(plain)
    fraction = np.ones_like(x)
    safe = np.where(far, x, 1.0)
    for n in range(60, 0, -1):
        fraction = safe + (n - a) / (1.0 + n / fraction) if n < 60 else safe
    with np.errstate(divide="ignore"):
        tail = a * np.log(safe) - safe - gammaln(a) - np.log(np.maximum(fraction, 1e-300))
        return np.where(far, tail, np.log(np.where(far, 1.0, plain)))


def sigma_of_ln_p(ln_p: ArrayLike) -> FloatArray:
    """One-sided Gaussian sigma whose tail has probability exp(ln_p); 0 for p = 1/2, negative above.

    >>> round(float(sigma_of_ln_p(np.log(0.0013498980316300933))), 6)
    3.0
    """
    return -ndtri_exp(np.asarray(ln_p, dtype=np.float64))


def adequate(chi2: float, points: int, dof: int, p_min: float) -> bool | None:
    """Whether a fit stands: True, False, or None where it leaves nothing to test.

    A chi-square that even no free parameter could excuse, Q(points/2, chi2/2) < p_min, is refused whatever dof.
    """
    if points > 0 and one_tail(chi2, points) < p_min:
        return False
    if dof <= 0:
        return None
    return bool(one_tail(chi2, dof) >= p_min)


def one_tail(chi2: float, dof: float) -> float:
    """As chi2_tail, of single numbers and dof > 0, which is ten times quicker."""
    return float(gammaincc(0.5 * dof, 0.5 * max(chi2, 0.0)))


def aic(minus2lnl: ArrayLike, k: ArrayLike) -> FloatArray:
    """Akaike 1974: -2 ln L + 2 k."""
    return np.asarray(minus2lnl) + 2.0 * np.asarray(k)


def bic(minus2lnl: ArrayLike, k: ArrayLike, n: ArrayLike) -> FloatArray:
    """Schwarz 1978: -2 ln L + k ln n."""
    return np.asarray(minus2lnl) + np.asarray(k) * np.log(np.maximum(n, 1))
