"""The integral equation of strip_plane.py against two closed forms that it does not use.

* Sheet of finite conductivity, plane much wider than everything: K(k) = -I e^{-|k| h} lam / (lam + |k|),
  lam = j w mu0 / (2 Zs), in real space -K / I = (lam / 2 pi) [g(h - jx) + g(h + jx)], g(z) = e^{lam z} E1(lam z).
  Derivation: spectral form of the sheet condition (Maxwell's receding images for the thin sheet); exponential integral
  from SciPy.
* Perfectly conducting strip ground: Joukowski map, -K / I = [P(th) + P(-th)] / (a sin th), x = a cos th, with the
  Poisson kernel P. Derivation: conformal mapping of the slit plane, see Leone, IEEE T-EMC 43(4), 2001, for the same
  method.
"""

import numpy as np
import pytest
from scipy.special import exp1

from strip_plane import MU0, StripPlane


def wide_sheet(x, h, zs, frequency):
    lam = 1j * 2 * np.pi * frequency * MU0 / (2 * zs)

    def g(z):
        w = lam * z
        if abs(w) > 30:
            term, total = 1 / w, 0
            for k in range(1, 14):
                total += term
                term *= -k / w
            return total
        return np.exp(w) * exp1(w)

    return lam / (2 * np.pi) * (g(h - 1j * x) + g(h + 1j * x))


@pytest.mark.parametrize("h", [0.1e-3, 0.2e-3, 1.0e-3])
@pytest.mark.parametrize("frequency", [1e5, 1e6, 1e7, 1e8])
def test_wide_sheet(h, frequency):
    zs = 0.5e-3
    lam = np.pi * frequency * MU0 / zs
    width = 2000 * (h + 1 / lam)
    plane = StripPlane(width, 0.0, h, zs, frequency, count=1400)
    for x in [0.0, h, 3 * h, 10 * h]:
        got = plane.mean(x - h / 50, x + h / 50)
        want = wide_sheet(x, h, zs, frequency)
        assert abs(got - want) <= 2e-3 * abs(want), (h, frequency, x / h, got, want)


@pytest.mark.parametrize("ratio", [5, 10, 20, 50])
@pytest.mark.parametrize("place", [0.0, 0.5, 0.8])
def test_perfect_strip(ratio, place):
    h = 1e-3
    a = ratio * h / 2
    z0 = place * a + 1j * h
    zeta0 = (z0 + np.sqrt(z0 - a) * np.sqrt(z0 + a)) / a
    rho, angle = abs(zeta0), np.angle(zeta0)

    def poisson(th):
        return (rho**2 - 1) / (2 * np.pi * (1 - 2 * rho * np.cos(th - angle) + rho**2))

    # |lam| h = 1e6: resistance no longer matters
    zs = 1e-3
    frequency = 1e6 * zs / (np.pi * MU0 * h)
    plane = StripPlane(2 * a, place * a, h, zs, frequency, count=1400)
    for u in [-0.95, -0.5, 0.0, 0.25, 0.5, 0.75, 0.9, 0.95]:
        th = np.arccos(u)
        want = (poisson(th) + poisson(-th)) / (a * np.sin(th))
        got = plane.mean((u - 0.002) * a, (u + 0.002) * a)
        assert abs(got - want) <= 3e-3 * want, (ratio, place, u, got, want)


def test_strip_track():
    """Uniform current over w = 2h on a wide perfect plane: (I / pi w) [atan((x + w/2) / h) - atan((x - w/2) / h)]
    (Holloway and Kuester, IEEE T-MTT 43(5), 1995)."""
    h, w, zs = 1e-3, 2e-3, 1e-3
    frequency = 1e6 * zs / (np.pi * MU0 * h)
    plane = StripPlane(2000 * h, 0.0, h, zs, frequency, w, "uniform", count=1400)
    for x in np.array([0, 1, 2, 3, 5]) * h:
        want = (np.arctan((x + w / 2) / h) - np.arctan((x - w / 2) / h)) / (np.pi * w)
        got = plane.mean(x - h / 50, x + h / 50)
        assert abs(got - want) <= 2e-3 * want, (x / h, got, want)
