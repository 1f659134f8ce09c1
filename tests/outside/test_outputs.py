"""The documents of a run as a reader outside the project sees them: `numbers/index.json` and its arrays with NumPy,
`findings.json`, and a conservation law that needs no knowledge of the solver.

Conservation (Kirchhoff): through any section across the plane between the two landings the whole return flows, so the
sum of kx over a column of cells, times the cell, is -1 to the accuracy of the solve. At DC the current does not depend
on the height; its density through a section far from the landings of a strip is uniform.
"""

import json

import numpy as np
import pytest

from conftest import Numbers
from gerber_board import write_board, write_review

BANDS = [("B0", 1e3), ("B1", 1e6), ("B2", 1e8)]
FIGURES = {
    "share_3h",
    "half_width_50_m",
    "half_width_80_m",
    "half_width_95_m",
    "extra_path_m",
    "loop_resistance_ohm",
    "loop_inductance_h",
}


@pytest.fixture(scope="module")
def drawn(ebbmap, tmp_path_factory):
    folder = tmp_path_factory.mktemp("drawn")
    write_board(folder / "fab", 60, 12, 6.0, 0.4, 6)
    write_review(folder / "review.toml", 0.2, BANDS, 0.2)
    text = (folder / "review.toml").read_text()
    (folder / "review.toml").write_text(text.replace("[solver]", '[[band]]\nname = "DC"\n[solver]'))
    ebbmap.run("draw", "review.toml", "--out", "out", "--numbers", cwd=folder)
    return folder / "out"


def test_index_and_arrays(drawn):
    numbers = Numbers(drawn / "numbers")
    assert numbers.index["schema"] == 1 and numbers.index["time_factor"] == "exp(+jwt)"
    assert [entry["frequency_hz"] for entry in numbers.maps()] == [f for _, f in BANDS] + [0]
    for entry in numbers.maps():
        assert entry["net"] == "SIG" and entry["plane"] == {"layer": "L2", "net": "GND"}
        assert entry["model"] == "sheet" and 0 <= entry["residual"] <= 1e-4
        arrays = numbers.load(entry)
        kx, ky, copper = arrays["kx"], arrays["ky"], arrays["copper"]
        assert kx.shape == ky.shape == copper.shape and kx.dtype == complex and copper.dtype == bool
        assert entry["origin_m"] == pytest.approx([0, 0], abs=1e-9)
        assert np.isfinite(kx).all() and np.isfinite(ky).all()


def test_whole_return_through_every_section(drawn):
    numbers = Numbers(drawn / "numbers")
    for entry in numbers.maps():
        kx, cell = numbers.load(entry)["kx"], entry["cell_m"]
        for x_mm in [12, 20, 30, 45]:
            column = round(x_mm * 1e-3 / cell)
            total = kx[:, column].sum() * cell
            assert abs(total + 1) <= 1e-6, (entry["frequency_hz"], x_mm, total)


def test_direct_current_is_uniform_far_from_the_landings(drawn):
    numbers = Numbers(drawn / "numbers")
    entry = numbers.maps()[-1]
    assert entry["frequency_hz"] == 0
    kx = numbers.load(entry)["kx"]
    middle = kx[:, kx.shape[1] // 2]
    assert np.abs(middle + 1 / 12e-3).max() <= 1e-3 / 12e-3, middle


def test_loop_resistance_at_direct_current(drawn):
    """Track 48 mm of 0.4 x 0.035 mm copper and a plane 12 mm wide, 58 MS/m. The plane between the landings has at
    least the resistance of the strip between them; the rest is the spreading at two circles of the 0.3 mm barrels,
    together less than (Rs / pi) acosh(D / 2a) of an endless sheet plus the strip (van der Pauw's method of images)."""
    findings = json.loads((drawn / "findings.json").read_text())
    entry = findings["maps"][-1]
    square = 1 / (58e6 * 35e-6)
    track = square * 48 / 0.4
    strip = square * 50 / 12
    spread = square / np.pi * np.arccosh(50 / 0.3)
    got = entry["figures"]["loop_resistance_ohm"]["value"]
    assert track + strip < got < 1.01 * track + strip + spread, (got, track, strip, spread)


def test_findings(drawn):
    findings = json.loads((drawn / "findings.json").read_text())
    assert findings["schema"] == 1 and findings["board"] == {"title": "Straight track", "revision": "A"}
    assert findings["skipped"] == [] and len(findings["maps"]) == 4
    for entry in findings["maps"]:
        assert FIGURES <= set(entry["figures"])
        assert (drawn / entry["svg"]).exists() and (drawn / entry["png"]).exists()
        assert entry["driver_landing"]["x_mm"] == pytest.approx(5, abs=1e-6)
        assert entry["receiver_landing"]["x_mm"] == pytest.approx(55, abs=1e-6)
        for name in FIGURES:
            figure = entry["figures"][name]
            assert figure is None or set(figure) == {"value", "without_voids", "error"}
    for message in findings["messages"]:
        assert message["severity"] in ("note", "warning", "error") and message["code"] and message["text"]
    shares = [entry["figures"]["share_3h"]["value"] for entry in findings["maps"][:3]]
    assert shares[0] < shares[1] < shares[2], "the return gathers under the track as the frequency rises"


def test_share_at_high_frequency(drawn):
    """Strip of w = 2h over a wide perfect plane: 78.8 % within 3h for a uniform profile (Holloway and Kuester, IEEE
    T-MTT 43(5), 1995, integrated); crowding to the track's edges lowers it a little, a plane of 60 h adds a little."""
    findings = json.loads((drawn / "findings.json").read_text())
    share = findings["maps"][2]["figures"]["share_3h"]
    assert share["value"] == pytest.approx(0.788, abs=0.02), share
