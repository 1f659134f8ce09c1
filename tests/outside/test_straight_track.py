"""Straight tracks through the whole program - Gerber files, review, sheet solve, `--numbers` - against the
one-dimensional integral equation of strip_plane.py for an endless plane of the same width.

The board is four times as long as wide; at mid-track, cells of d = h/2 must agree within 1 % of the local density for
|y| <= 10 h, two cells off the plane's edges, from 1 kHz on. Sheet impedance: Zs = (eta / 2) coth(gamma t / 2) of a
35 um foil of 58 MS/m at 20 degC (field solution of a foil with equal fields on both faces, textbook).
"""

import numpy as np
import pytest

from conftest import Numbers
from gerber_board import write_board, write_review
from strip_plane import MU0, StripPlane

FREQUENCIES = [1e3, 1e4, 1e5, 1e6, 1e7, 1e8]
FOIL_M = 35e-6
SIGMA = 58e6


def foil_impedance(frequency):
    gamma = (1 + 1j) * np.sqrt(np.pi * frequency * MU0 * SIGMA)
    eta = gamma / SIGMA
    return eta / 2 / np.tanh(gamma * FOIL_M / 2)


def draw(ebbmap, folder, h_mm, cells_per_h, track_part, track_width_mm, frequencies=FREQUENCIES):
    """Maps of one board 48 h wide; the track lies at `track_part` of the width, not on a line of the grid. Where h is
    small the 2 mm from the board's end to the track's count for more heights, so the board is 72 h wide there: at mid-track
    the finite length changes the tail at 10 h by about (10 h / half length)^2 / 2."""
    cell_mm = h_mm / cells_per_h
    width_mm = (72 if h_mm < 0.15 else 48) * h_mm
    track_y_mm = round(track_part * width_mm + 0.3 * cell_mm, 6)
    write_board(folder / "fab", 4 * width_mm, width_mm, track_y_mm, track_width_mm, margin_mm=max(2.0, 4 * h_mm))
    bands = [(f"B{n}", f) for n, f in enumerate(frequencies)]
    write_review(folder / "review.toml", h_mm, bands, cell_mm)
    ebbmap.run("draw", "review.toml", "--out", "out", "--numbers", cwd=folder)
    return Numbers(folder / "out" / "numbers"), width_mm * 1e-3, track_y_mm * 1e-3


def worst_error(numbers, entry, width_m, track_y_m, profile, track_width_m):
    """Largest |map - integral equation| / |integral equation| at mid-track, and its distance from the track."""
    arrays = numbers.load(entry)
    kx, cell = arrays["kx"], entry["cell_m"]
    rows, columns = kx.shape
    h, zs = entry["height_m"], complex(*entry["zs_ohm"])
    middle = 0.5 * width_m
    plane = StripPlane(width_m, track_y_m - middle, h, zs, entry["frequency_hz"], track_width_m, profile)
    lower = entry["origin_m"][1] + cell * np.arange(rows)
    upper = lower + cell
    inside = (lower > 2 * cell - 1e-9) & (upper < width_m - 2 * cell + 1e-9)
    near = np.abs(0.5 * (lower + upper) - track_y_m) <= 10 * h
    chosen = inside & near
    want = plane.mean(lower[chosen] - middle, upper[chosen] - middle)
    got = -kx[chosen, columns // 2]
    error = np.abs(got - want) / np.abs(want)
    at = int(np.argmax(error))
    return error[at], (0.5 * (lower + upper)[chosen][at] - track_y_m) / h


@pytest.mark.parametrize("h_mm, track_part", [(0.1, 0.5), (0.2, 0.5), (0.2, 0.7), (1.0, 0.5)])
def test_narrow_track(ebbmap, tmp_path, h_mm, track_part):
    w_mm = h_mm / 5
    numbers, width_m, track_y_m = draw(ebbmap, tmp_path, h_mm, 2, track_part, w_mm)
    assert [entry["frequency_hz"] for entry in numbers.maps()] == pytest.approx(FREQUENCIES)
    failed = []
    for entry in numbers.maps():
        f = entry["frequency_hz"]
        zs = complex(*entry["zs_ohm"])
        assert abs(zs - foil_impedance(f)) <= 1e-6 * abs(zs), (f, zs, foil_impedance(f))
        # the solver may put the plane's current at its face or deeper, and the track's inside the track
        assert h_mm * 1e-3 * (1 - 1e-9) <= entry["height_m"] <= h_mm * 1e-3 + FOIL_M * 1.001, entry["height_m"]
        error, place = worst_error(numbers, entry, width_m, track_y_m, "uniform", entry["width_m"])
        print(f"h {h_mm} mm, {f:.0e} Hz: worst {100 * error:.2f} % at {place:.1f} h")
        if error > 0.01:
            failed.append((h_mm, f, error, place))
    assert not failed, failed


def test_wide_track(ebbmap, tmp_path):
    """w = 2 h, where the profile across the track matters: the map lies between, or at, the uniform and the
    edge-crowded profile, and is within 1 % of one of them."""
    h_mm = 0.2
    numbers, width_m, track_y_m = draw(ebbmap, tmp_path, h_mm, 2, 0.5, 2 * h_mm, [1e4, 1e6, 1e8])
    for entry in numbers.maps():
        assert entry["width_m"] == pytest.approx(0.4e-3, rel=1e-6)
        errors = [worst_error(numbers, entry, width_m, track_y_m, p, 0.4e-3)[0] for p in ("uniform", "edge")]
        print(entry["frequency_hz"], errors)
        assert min(errors) <= 0.01, (entry["frequency_hz"], errors)


@pytest.mark.parametrize("h_mm", [0.1, 0.2, 1.0])
def test_coarser_cells(ebbmap, tmp_path, h_mm):
    """d = h: 2 %, d = 2 h: 6 %."""
    for cells_per_h, tolerance in [(1, 0.02), (0.5, 0.06)]:
        folder = tmp_path / f"cells-{cells_per_h}"
        numbers, width_m, track_y_m = draw(ebbmap, folder, h_mm, cells_per_h, 0.5, h_mm / 5, [1e5, 1e6, 1e7, 1e8])
        for entry in numbers.maps():
            error, place = worst_error(numbers, entry, width_m, track_y_m, "uniform", entry["width_m"])
            print(f"d = h / {cells_per_h}, {entry['frequency_hz']:.0e} Hz: worst {100 * error:.2f} % at {place:.1f} h")
            assert error <= tolerance, (cells_per_h, entry["frequency_hz"], error, place)
