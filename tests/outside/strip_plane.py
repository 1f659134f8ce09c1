"""Return current of a straight track over an endless strip plane, from a one-dimensional integral equation.

Model. A thin sheet |x| < W/2 with sheet impedance Zs [ohm per square] carries K(x) along y; a track at (x0, h) carries
+I. Nothing varies along y, so E_y = Zs K = -j w A_y - g with one unknown gradient g, and

    A_y(x) = -(mu0 / 2 pi) [ int K(x') ln|x - x'| dx' + I <ln sqrt((x - x0 - s)^2 + h^2)>_s ],   int K dx = -I,

where <>_s is the mean over the track's width for the given current profile. The constant of the logarithm drops out
with g. Pulses on panels graded towards the edges and the track, tested with the panels themselves (Galerkin), dense
complex solve. All panel integrals are closed forms, so nothing here shares a grid, a kernel or a formula with ebbmap.

Source: the field of a line current and the boundary condition of a conducting sheet, any textbook of electromagnetics;
the discretization is derived here. Checked in test_strip_plane.py against two closed forms that it does not use.
"""

import numpy as np
from scipy.interpolate import CubicSpline

MU0 = 4e-7 * np.pi


def _log_integral_twice(u):
    """Second antiderivative of ln|u|."""
    size = np.abs(u)
    return np.where(size > 0, u * u / 2 * np.log(np.where(size > 0, size, 1.0)) - 0.75 * u * u, 0.0)


def _line_log_integral(u, h):
    """Antiderivative in u of ln sqrt(u^2 + h^2)."""
    return 0.5 * (u * np.log(u * u + h * h) - 2 * u + 2 * h * np.arctan2(u, h))


def _profile_points(width, profile, count=64):
    """Offsets and weights (sum 1) that stand for the current's spread over the track's width."""
    if width <= 0 or profile == "filament":
        return np.array([0.0]), np.array([1.0])
    if profile == "uniform":
        points, weights = np.polynomial.legendre.leggauss(count)
        return points * width / 2, weights / 2
    if profile == "edge":  # density 1 / sqrt(1 - (2 s / w)^2): Chebyshev points of equal weight
        angles = (np.arange(count) + 0.5) * np.pi / count
        return np.cos(angles) * width / 2, np.full(count, 1.0 / count)
    raise ValueError(profile)


def graded_panels(half_width, x0, h, count=1000):
    """Panel edges from -half_width to half_width: fine (to 1e-7 of the width) at both edges, h/40 at the track."""
    edges = half_width * -np.cos(np.linspace(0, np.pi, count + 1))
    near = x0 + h * np.sinh(np.linspace(-np.arcsinh(60.0), np.arcsinh(60.0), count // 2 + 1))
    merged = np.unique(np.concatenate([edges, near[np.abs(near) < half_width]]))
    keep = np.concatenate([[True], np.diff(merged) > 1e-9 * half_width])
    merged = merged[keep]
    merged[-1] = half_width
    return merged


class StripPlane:
    """Solution for one track, frequency and sheet; `flux(x)` is -(current between the left edge and x) / I."""

    def __init__(self, width, x0, h, zs, frequency, track_width=0.0, profile="filament", count=1000):
        edges = graded_panels(width / 2, x0, h, count)
        size = np.diff(edges)
        n = len(size)
        omega = 2 * np.pi * frequency
        difference = edges[:, None] - edges[None, :]
        second = _log_integral_twice(difference)
        # int over panel i, int over panel k of ln|x - x'|
        double = -(second[1:, 1:] - second[1:, :-1] - second[:-1, 1:] + second[:-1, :-1])
        offsets, weights = _profile_points(track_width, profile)
        line = np.zeros(n)
        for offset, weight in zip(offsets, weights):
            value = _line_log_integral(edges - x0 - offset, h)
            line += weight * np.diff(value)
        factor = 1j * omega * MU0 / (2 * np.pi)
        system = np.zeros((n + 1, n + 1), dtype=complex)
        system[:n, :n] = -factor * double + np.diag(zs * size)
        system[:n, n] = size
        system[n, :n] = size
        right = np.concatenate([factor * line, [-1.0]])
        density = np.linalg.solve(system, right)[:n]
        self.edges = edges
        self.density = -density
        self._flux = CubicSpline(edges, np.concatenate([[0], np.cumsum(-density * size)]))

    def flux(self, x):
        """Current of the return between the left edge and x, in A per A of track current."""
        return self._flux(np.clip(x, self.edges[0], self.edges[-1]))

    def mean(self, left, right):
        """Mean density of the return between left and right in A/m per A."""
        return (self.flux(right) - self.flux(left)) / (right - left)
