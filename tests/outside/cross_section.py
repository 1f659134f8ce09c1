"""Return current of a straight track in a cross-section with several conductors, from a two-dimensional integral equation.

Model. Flat strips left < x < right at height y, each with its sheet impedance Zs [ohm per square] (zero: perfect), carry
K(x) along z; nothing varies along z. On every strip

    0 = Zs K + j w A_z + g,    A_z(x, y) = -(mu0 / 2 pi) sum over strips int K(x') ln sqrt((x - x')^2 + (y - y')^2) dx'

with one unknown gradient g for each group of strips. Strips of one group are tied together at the ends of a long line; a
group's total current is given, and all totals add up to zero, so that the constant of the logarithm drops out with the
gradients. Two groups that are joined at the ends through a lumped impedance have instead of their two totals the sum of
both and the loop equation g_a - g_b = z I_a, z = ohm of the loop's joints per metre of line, where the track's return enters and
leaves group b.

Pulses on panels graded towards all edges and towards the edges of other strips, tested at their middles, dense complex solve.
The panel integral is a closed form. No grid, kernel or formula is shared with ebbmap.

Source: field of a line current and boundary condition of a conducting sheet, any textbook of electromagnetics; the
discretization is derived here. Checked in test_cross_section.py against closed forms that it does not use.
"""

from dataclasses import dataclass

import numpy as np
from scipy.interpolate import CubicSpline

MU0 = 4e-7 * np.pi


@dataclass(frozen=True)
class Strip:
    """A flat conductor of the cross-section; lengths in metres. `profile` fixes the shape of its density to `uniform`
    (a source whose current spreads so); without it the density is solved."""

    group: str
    left: float
    right: float
    y: float
    zs: complex = 0.0
    profile: str = ""


def _half(length, count, finest):
    """Distances from an edge: geometric from `finest` up to `length`, starting with 0."""
    return np.concatenate([[0.0], np.geomspace(min(finest, length / 4), length, count)])


def _panels(strip, marks, finest, count):
    """Panel edges of a strip: graded to both ends and to the `marks` (x of what lies above, below or beside)."""
    width = strip.right - strip.left
    inner = [x for x in marks if strip.left + 1e-6 * width < x < strip.right - 1e-6 * width]
    stations = np.unique([strip.left, *inner, strip.right])
    edges = [strip.left]
    for a, b in zip(stations[:-1], stations[1:]):
        middle = (a + b) / 2
        edges.extend(a + _half(middle - a, count, finest)[1:])
        edges.extend((b - _half(b - middle, count, finest)[1:-1])[::-1])
        edges.append(b)
    edges = np.unique(edges)
    keep = np.concatenate([[True], np.diff(edges) > 1e-3 * finest])
    edges = edges[keep]
    edges[-1] = strip.right
    return edges


def _log_integral(x, y, left, right):
    """int over left..right of ln sqrt((x - x')^2 + y^2) dx'."""

    def part(u):
        square = u * u + y * y
        log = 0.5 * np.log(np.where(square > 0, square, 1.0))
        angle = np.where(y == 0, 0.0, y * np.arctan2(u, np.where(y == 0, 1.0, np.abs(y))) * np.sign(y))
        return u * log - u + angle

    return part(right - x) - part(left - x)


class CrossSection:
    """Solution for strips, a frequency and the totals of their groups in A. `joined` is (a, b, z): the groups a and b
    share their totals through joints of z ohm per metre of line."""

    def __init__(self, strips, frequency, totals, joined=None, finest=None, count=60):
        finest = finest or 1e-3 * min(strip.right - strip.left for strip in strips)
        marks = sorted({x for strip in strips for x in (strip.left, strip.right)})
        self.strips = list(strips)
        self.edges = [
            np.linspace(s.left, s.right, 4 * count + 1) if s.profile else _panels(s, marks, finest, count)
            for s in strips
        ]
        left = np.concatenate([e[:-1] for e in self.edges])
        right = np.concatenate([e[1:] for e in self.edges])
        owner = np.concatenate([np.full(len(e) - 1, k) for k, e in enumerate(self.edges)])
        y = np.array([s.y for s in strips])[owner]
        zs = np.array([s.zs for s in strips], dtype=complex)[owner]
        size, middle, omega = right - left, (left + right) / 2, 2 * np.pi * frequency
        potential = -MU0 / (2 * np.pi) * _log_integral(middle[:, None], y[:, None] - y[None, :], left, right)
        groups = list(dict.fromkeys(s.group for s in strips))
        group_of = np.array([groups.index(s.group) for s in strips])[owner]
        n, m = len(size), len(groups)
        system = np.zeros((n + m, n + m), dtype=complex)
        system[:n, :n] = 1j * omega * potential + np.diag(zs)
        system[np.arange(n), n + group_of] = 1.0
        right_side = np.zeros(n + m, dtype=complex)
        for g, name in enumerate(groups):
            system[n + g, :n] = np.where(group_of == g, size, 0.0)
            right_side[n + g] = totals[name]
        if joined:
            a, b, z = groups.index(joined[0]), groups.index(joined[1]), joined[2]
            system[n + a, :n] += system[n + b, :n]
            right_side[n + a] += right_side[n + b]
            system[n + b, :] = 0
            system[n + b, :n] = np.where(group_of == a, -z * size, 0.0)
            system[n + b, n + a], system[n + b, n + b] = 1.0, -1.0
            right_side[n + b] = 0
        # rows that keep a given profile: all densities of that strip are equal
        for k, strip in enumerate(strips):
            mine = np.flatnonzero(owner == k)
            if strip.profile == "uniform":
                system[mine[1:], :] = 0
                system[mine[1:], mine[1:]], system[mine[1:], mine[:-1]] = 1.0, -1.0
                # the first row would be the strip's own field equation; its gradient is what closes it
            elif strip.profile:
                raise ValueError(strip.profile)
        scale = np.abs(system).max(axis=1)
        found = np.linalg.solve(system / scale[:, None], right_side / scale)
        self.gradients = dict(zip(groups, found[n:]))
        self.density = [found[:n][owner == k] for k in range(len(strips))]

    def current(self, index, left=-np.inf, right=np.inf):
        """Current of strip `index` between two abscissas in A."""
        edges = np.clip(self.edges[index], left, right)
        return np.sum(self.density[index] * np.diff(edges))

    def total(self, *indices):
        """Current of several strips in A."""
        return sum(self.current(k) for k in indices)

    def mean(self, index, left, right):
        """Mean density of strip `index` over intervals, in A/m."""
        edges = self.edges[index]
        flux = np.concatenate([[0.0], np.cumsum(self.density[index] * np.diff(edges))])
        at = CubicSpline(edges, flux)
        return (at(right) - at(left)) / (right - left)
