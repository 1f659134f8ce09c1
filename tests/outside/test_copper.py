"""What `look --json` says of fabrication sets, against gerbonara (object counts, extents, drill hits) and Shapely
(composed copper areas), each layer read and composed by those libraries alone (copper.py).

Sets: the samples of this repository, a board written by gerber_board.py, and boards in a folder `shared/boards` beside
the repository when there is one; those are only measured, nothing is kept of them.
"""

import math
from pathlib import Path

import pytest

from conftest import ROOT
from copper import compose, copper_files, counts, drill_files, file_function, largest_region, read_drill, read_gerber
from gerber_board import write_board

SETS = sorted(path for path in (ROOT / "samples").rglob("fab") if path.is_dir())
SETS += sorted(path for path in (ROOT.parent / "shared" / "boards").glob("x2-*") if path.is_dir())


def name_of(path):
    return "sample-" + path.parent.name if path.name == "fab" else path.name


def check_layers(look, folder):
    files = copper_files(folder)
    assert sorted(files) == [layer["index"] for layer in look["layers"]]
    composed = 0
    for layer in look["layers"]:
        gerber = read_gerber(files[layer["index"]])
        got, want = layer["objects"], counts(gerber)
        assert (got["draws"], got["flashes"]) == (want["draws"], want["flashes"]), (layer["name"], got, want)
        # gerbonara counts contours; a G36 statement may hold several
        statements = files[layer["index"]].read_text(encoding="utf-8", errors="replace").count("G36*")
        assert got["regions"] == statements <= want["regions"], (layer["name"], got, want, statements)
        try:
            copper = compose(gerber)
        except NameError:  # gerbonara 1.5.0 cannot draw thermal primitives of macros ('d_outer' is not defined)
            continue
        composed += 1
        assert layer["copper_area_mm2"] == pytest.approx(copper.area, rel=2e-5, abs=1e-3), layer["name"]
        largest = largest_region(gerber)
        assert (layer["largest_region"] is None) == (largest is None), layer["name"]
        if largest:
            assert layer["largest_region"]["area_mm2"] == pytest.approx(largest[0], rel=2e-5), layer["name"]
            assert layer["largest_region"]["holes"] == largest[1], layer["name"]
    assert composed > 0


def check_outline(look, folder):
    profiles = [p for p in sorted(Path(folder).rglob("*")) if p.is_file() and file_function(p)[:1] == ["Profile"]]
    assert len(profiles) == 1
    gerber = read_gerber(profiles[0])
    lines = [thing for thing in gerber.objects if hasattr(thing, "x1")]
    if any(type(thing).__name__ == "Arc" for thing in lines):
        return  # the ends of arcs are not the extent of a board with round corners
    xs = [x for line in lines for x in (line.x1, line.x2)]
    ys = [y for line in lines for y in (line.y1, line.y2)]
    want = [min(xs), min(ys), max(xs), max(ys)]
    got = look["outline"]["min_mm"] + look["outline"]["max_mm"]
    assert got == pytest.approx(want, abs=1e-3)


def check_holes(look, folder):
    hits = routs = 0
    for path in drill_files(folder):
        try:
            drill = read_drill(path)
        except SyntaxError:  # gerbonara 1.5.0 knows neither routed arcs nor G85 with a full start point
            return
        hits += sum(type(thing).__name__ == "Flash" for thing in drill.objects)
        routs += sum(type(thing).__name__ != "Flash" for thing in drill.objects)
    holes = look["holes"]
    round_holes = holes["plated"] + holes["non_plated"] - holes["slots"]
    assert round_holes == hits, (holes, hits, routs)
    # a routed slot may have several pieces, so there are at most as many slots as pieces, and some if there are pieces
    assert holes["slots"] <= routs and (holes["slots"] > 0) == (routs > 0), (holes, hits, routs)


@pytest.mark.parametrize("folder", SETS, ids=name_of)
def test_fabrication_set(ebbmap, folder):
    look = ebbmap.look(folder)
    check_layers(look, folder)
    check_outline(look, folder)
    check_holes(look, folder)


def test_written_board(ebbmap, tmp_path):
    """A board of known numbers: 60 x 20 mm, so that the checks above run where there is no sample."""
    write_board(tmp_path / "fab", 60, 20, 10, 0.4, 5)
    look = ebbmap.look(tmp_path / "fab")
    check_layers(look, tmp_path / "fab")
    check_outline(look, tmp_path / "fab")
    check_holes(look, tmp_path / "fab")
    assert look["outline"]["area_mm2"] == pytest.approx(1200, rel=1e-9)
    track = 50 * 0.4 + math.pi * 0.2**2 + (0.4**2 - math.pi * 0.2**2)  # the square pads hold the round ends' halves
    pads = 2 * math.pi * 0.25**2
    assert look["layers"][0]["copper_area_mm2"] == pytest.approx(track + pads, rel=2e-3)
