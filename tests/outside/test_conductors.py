"""Several conductors through the whole program - Gerber files, review, solve of all sheets, `--numbers` - against the
two-dimensional integral equation of cross_section.py for the same cross-section, at mid-track.

* A track (w = h) between two pours on its own layer, gaps of h/2, h, 2.5 h and 5 h: the pours' share of the return within
  0.02 of I. The rest flows in the plane.
* A track on the bottom with a supply plane between it and the ground plane: floating (density on the ground plane within
  3 % of its peak), and joined to ground through capacitors at both landings (share of the ground plane within 0.02 of I).

The reference takes the sheet impedance, and the height of the far plane over the near one, from the stackup: 35 um foils,
58 MS/m. The joints at the ends are points, where the reference has none: what the currents' spreading there adds to the loop is
inside the bounds on boards long enough.
"""

import numpy as np
import pytest

from conftest import Numbers
from cross_section import CrossSection, Strip
from gerber_board import write_pour_board, write_review, write_supply_board
from test_straight_track import foil_impedance

H_MM, W_MM, WIDTH_MM, LENGTH_MM = 0.5, 0.5, 16.0, 60.0


def plane_map(numbers, layer, frequency):
    found = [m for m in numbers.maps() if m["plane"]["layer"] == layer and m["frequency_hz"] == pytest.approx(frequency)]
    return found[0] if found else None


def section(numbers, entry):
    """Lower and upper limits of the cells of the section at mid-track, from its middle, and the density in each."""
    kx, cell = numbers.load(entry)["kx"], entry["cell_m"]
    low = cell * (np.arange(kx.shape[0]) - kx.shape[0] / 2)
    return low, low + cell, -kx[:, kx.shape[1] // 2]


def share(numbers, entry):
    low, high, density = section(numbers, entry)
    return np.sum(density * (high - low))


@pytest.mark.parametrize("gap_part", [0.5, 1.0, 2.5, 5.0])
def test_pours_beside_the_track(ebbmap, tmp_path, gap_part):
    frequency, gap_mm = 1e8, gap_part * H_MM
    write_pour_board(tmp_path / "fab", LENGTH_MM, WIDTH_MM, W_MM, gap_mm, 6)
    write_review(tmp_path / "review.toml", H_MM, [("B0", frequency)], 0.125)
    ebbmap.run("draw", "review.toml", "--out", "out", "--numbers", cwd=tmp_path)
    numbers = Numbers(tmp_path / "out" / "numbers")
    in_plane = share(numbers, plane_map(numbers, "L2", frequency))
    h, w, edge = H_MM * 1e-3, W_MM * 1e-3, WIDTH_MM * 0.5e-3
    zs, start = foil_impedance(frequency), (W_MM / 2 + gap_mm) * 1e-3
    strips = [
        Strip("track", -w / 2, w / 2, h, profile="uniform"),
        Strip("ground", -edge, edge, 0.0, zs),
        Strip("ground", start, edge, h, zs),
        Strip("ground", -edge, -start, h, zs),
    ]
    want = -CrossSection(strips, frequency, {"track": 1.0, "ground": -1.0}, count=40).total(2, 3)
    got = 1 - in_plane
    print(f"gap {gap_part} h: pours {got:.4f}, integral equation {want:.4f}")
    assert abs(got - want) <= 0.02, (gap_part, got, want)
    on_top = plane_map(numbers, "L1", frequency)
    if on_top:  # a map of the pours is written where they carry 1 % and more
        assert abs(share(numbers, on_top) + in_plane - 1) <= 1e-3


CAPACITORS, FARAD, OHM, HENRY = 6, 100e-6, 2e-3, 0.1e-9
PARTS = (
    f'[[part]]\nreference = "C*"\ncapacitance = "{FARAD * 1e6:g}uF"\nresistance = "{OHM * 1e3:g}mohm"\n'
    f'inductance = "{HENRY * 1e9:g}nH"\n'
)


@pytest.mark.parametrize("joined", [False, True], ids=["floating", "joined"])
def test_track_over_a_supply_plane(ebbmap, tmp_path, joined):
    # Long and narrow, so that the currents' spreading at the few capacitors of each end adds little to the loop.
    length_mm, width_mm = (240.0, 8.0) if joined else (LENGTH_MM, WIDTH_MM)
    frequencies = [1e6, 1e7] if joined else [1e7]
    write_supply_board(tmp_path / "fab", length_mm, width_mm, W_MM, 6, CAPACITORS if joined else 0)
    bands = [(f"B{n}", f) for n, f in enumerate(frequencies)]
    write_review(tmp_path / "review.toml", [H_MM, H_MM], bands, 0.25, more=PARTS if joined else "")
    ebbmap.run("draw", "review.toml", "--out", "out", "--numbers", cwd=tmp_path)
    numbers = Numbers(tmp_path / "out" / "numbers")
    h, w, foil, edge = H_MM * 1e-3, W_MM * 1e-3, 35e-6, width_mm * 0.5e-3
    length = (length_mm - 10) * 1e-3  # between the landings
    for frequency in frequencies:
        zs, omega = foil_impedance(frequency), 2 * np.pi * frequency
        strips = [
            Strip("ground", -edge, edge, 0.0, zs),
            Strip("supply", -edge, edge, h + foil, zs),
            Strip("track", -w / 2, w / 2, 2 * h + foil, profile="uniform"),
        ]
        one = OHM + 1j * omega * HENRY + 1 / (1j * omega * FARAD)
        link = ("supply", "ground", 2 * one / CAPACITORS / length) if joined else None
        totals = {"track": 1.0, "ground": -1.0, "supply": 0.0}
        solved = CrossSection(strips, frequency, totals, link, count=40)
        entry = plane_map(numbers, "L1", frequency)
        got, want = share(numbers, entry), -solved.current(0)
        print(f"{frequency:.0e} Hz: ground plane {got:.4f}, integral equation {want:.4f}")
        assert abs(got - want) <= 0.02, (frequency, got, want)
        if joined:
            continue  # what the share may differ by is spread over the plane and would hide the pattern's own error
        low, high, density = section(numbers, entry)
        inner = slice(2, -2)
        reference = -solved.mean(0, low[inner], high[inner])
        worst = np.abs(density[inner] - reference).max() / np.abs(reference).max()
        print(f"  density: worst {100 * worst:.2f} % of the peak {np.abs(reference).max():.1f} A/m per A")
        assert worst <= 0.03, (frequency, worst)
