"""The integral equation of cross_section.py against closed forms that it does not use.

* A strip in the gap of two coplanar half planes (coplanar line in air): L' = (mu0 / 4) K(k') / K(k), k = w / (w + 2 g).
  Source: conformal mapping, Wen, IEEE T-MTT 17(12), 1969; elliptic integrals from SciPy.
* A filament between two perfect planes that are bonded at the ends: -K1 = (I / 2b) sin(pi h1 / b) / (cosh(pi x / b) -
  cos(pi h1 / b)), shares h2 / b and h1 / b. Source: series of images, standard.
* Two resistive sheets, one under the other, under a filament: for each wave number a system of two equations, turned
  back by an integral over wave numbers. Derivation: spectral form of the sheet condition.
* One resistive sheet against strip_plane.py, which tests with panels instead of points.
* What a finite cross-section must tend to: 45 % and 24 % of the return in two wide pours at gaps of h and 2.5 h (w = h).
"""

import numpy as np
import pytest
from scipy.special import ellipk

from cross_section import MU0, CrossSection, Strip
from strip_plane import StripPlane


def pours(gap, h=1.0, w=1.0, width=400.0, profile=""):
    """A track of width w at height h over a plane, a pour on each side of it."""
    outer = width / 2
    return [
        Strip("track", -w / 2, w / 2, h, profile=profile),
        Strip("ground", -outer, outer, 0.0),
        Strip("ground", w / 2 + gap, outer, h),
        Strip("ground", -outer, -w / 2 - gap, h),
    ]


@pytest.mark.parametrize("gap", [0.2, 0.5, 1.0, 2.5])
def test_coplanar_line(gap):
    """Half planes of 2000 widths of the line: what is cut off carries a part of about (a / x)^2."""
    reach = 2000.0
    strips = [Strip("track", -0.5, 0.5, 0.0), Strip("ground", 0.5 + gap, reach, 0.0)]
    strips.append(Strip("ground", -reach, -0.5 - gap, 0.0))
    solved = CrossSection(strips, 1 / (2 * np.pi), {"track": 1.0, "ground": -1.0}, finest=1e-5, count=80)
    # 0 = j w A + g: the loop's inductance is the difference of the gradients over -j w, w = 1
    inductance = (solved.gradients["ground"] - solved.gradients["track"]) / 1j
    k = 0.5 / (0.5 + gap)
    want = MU0 / 4 * ellipk(1 - k * k) / ellipk(k * k)
    assert inductance == pytest.approx(want, rel=1e-3)


@pytest.mark.parametrize("part", [0.5, 0.25, 0.1])
def test_between_two_planes(part):
    b, h1 = 1.0, part
    strips = [Strip("planes", -6.0, 6.0, 0.0), Strip("planes", -6.0, 6.0, b)]
    strips.append(Strip("track", -1e-3, 1e-3, h1, profile="uniform"))
    solved = CrossSection(strips, 1e6, {"track": 1.0, "planes": -1.0}, finest=1e-3, count=90)
    assert -solved.current(0).real == pytest.approx((b - h1) / b, abs=2e-3)
    assert -solved.current(1).real == pytest.approx(h1 / b, abs=2e-3)
    for x in [0.0, 0.1, 0.25, 0.5, 1.0]:
        want = np.sin(np.pi * h1) / 2 / (np.cosh(np.pi * x) - np.cos(np.pi * h1))
        assert -solved.mean(0, x - 0.005, x + 0.005).real == pytest.approx(want, rel=5e-3), x


@pytest.mark.parametrize("frequency", [1e5, 1e6, 1e7])
def test_two_resistive_sheets(frequency):
    h, s, z1, z2 = 0.2e-3, 0.5e-3, 0.5e-3, 1.0e-3
    omega = 2 * np.pi * frequency
    k = np.geomspace(1e-3, 2e5, 40001)
    own, across = 1j * omega * MU0 / (2 * k), 1j * omega * MU0 / (2 * k) * np.exp(-k * s)
    a, d, e1, e2 = z1 + own, z2 + own, -own * np.exp(-k * h), -own * np.exp(-k * (h + s))
    determinant = a * d - across**2
    spectra = [(e1 * d - e2 * across) / determinant, (a * e2 - across * e1) / determinant]
    half = 0.2
    strips = [Strip("planes", -half, half, 0.0, z1), Strip("planes", -half, half, -s, z2)]
    strips.append(Strip("track", -1e-6, 1e-6, h, profile="uniform"))
    solved = CrossSection(strips, frequency, {"track": 1.0, "planes": -1.0}, finest=1e-6, count=80)
    for x in np.array([0.0, 1.0, 3.0]) * h:
        for index, spectrum in enumerate(spectra):
            want = np.trapezoid(spectrum * np.cos(k * x), k) / np.pi + spectrum[0] * k[0] / np.pi
            got = solved.mean(index, x - h / 50, x + h / 50)
            assert abs(got - want) <= 0.01 * abs(want) + 0.002 / (np.pi * h), (frequency, x / h, index, got, want)


@pytest.mark.parametrize("frequency", [1e4, 1e7])
def test_one_sheet(frequency):
    h, width, zs = 0.2e-3, 20e-3, 0.6e-3 + 0.2e-3j
    strips = [Strip("plane", -width / 2, width / 2, 0.0, zs), Strip("track", -0.1e-3, 0.1e-3, h, profile="uniform")]
    solved = CrossSection(strips, frequency, {"track": 1.0, "plane": -1.0}, finest=1e-7, count=100)
    other = StripPlane(width, 0.0, h, zs, frequency, 0.2e-3, "uniform", count=500)
    for x in np.array([0.0, 1.0, 3.0, 10.0, 40.0]) * h:
        got, want = -solved.mean(0, x - h / 20, x + h / 20), other.mean(x - h / 20, x + h / 20)
        assert abs(got - want) <= 5e-3 * abs(want), (frequency, x / h, got, want)


def test_wide_pours():
    for gap, want in [(0.5, 0.60), (1.0, 0.457), (2.5, 0.246), (5.0, 0.131)]:
        solved = CrossSection(pours(gap), 1e6, {"track": 1.0, "ground": -1.0}, count=40)
        assert -solved.total(2, 3).real == pytest.approx(want, abs=0.004), gap
        # twice as many panels and finer ones: the digits that are compared stand
        finer = CrossSection(pours(gap), 1e6, {"track": 1.0, "ground": -1.0}, finest=2e-4, count=60)
        assert finer.total(2, 3) == pytest.approx(solved.total(2, 3), abs=1e-3), gap


def test_joined_through_an_impedance():
    """A large impedance leaves the second group without current, none ties it; between them the loop equation holds."""
    strips = [
        Strip("ground", -10.0, 10.0, 0.0, 1e-3),
        Strip("supply", -10.0, 10.0, 0.5, 1e-3),
        Strip("track", -0.25, 0.25, 1.0, profile="uniform"),
    ]
    totals = {"track": 1.0, "ground": -1.0, "supply": 0.0}

    def solve(strips, totals, joined=None):
        return CrossSection(strips, 1e4, totals, joined, count=25)

    free = solve(strips, totals)
    far = solve(strips, totals, ("supply", "ground", 1e9))
    assert abs(free.current(1)) < 1e-9 and abs(far.current(1)) < 1e-6
    tied = [Strip("ground", s.left, s.right, s.y, s.zs) if s.group == "supply" else s for s in strips]
    bonded = solve(tied, {"track": 1.0, "ground": -1.0})
    near = solve(strips, totals, ("supply", "ground", 0.0))
    assert near.current(1) == pytest.approx(bonded.current(1), abs=1e-9)
    z = 3e-2j
    some = solve(strips, totals, ("supply", "ground", z))
    gap = some.gradients["supply"] - some.gradients["ground"]
    assert gap == pytest.approx(z * some.current(1), rel=1e-9)
    # a passive joint of resistance takes power: less current than without it, never more
    lossy = solve(strips, totals, ("supply", "ground", 1e-2))
    assert abs(lossy.current(1)) < abs(bonded.current(1))
