"""`look` and `draw` on boards that lie in a folder `shared/boards` beside the repository, with a review of ten lines
that this script writes for each. Without that folder nothing is checked here; nothing of the boards is kept.

The review names the net with the largest plane as reference, one net that can be charted and one frequency.
"""

import hashlib
import json
import struct
import xml.etree.ElementTree as ElementTree

import numpy as np
import pytest

from conftest import ROOT, Numbers

BOARDS = sorted(path for path in (ROOT.parent / "shared" / "boards").glob("x2-*") if path.is_dir())
TRIED = 12


def largest_plane_net(look):
    planes = [plane for layer in look["layers"] for plane in layer["planes"]]
    areas = {}
    for plane in planes:
        areas[plane["net"]] = areas.get(plane["net"], 0) + plane["area_mm2"]
    ground = [net for net in areas if "GND" in net.upper()]
    return max(ground or areas, key=areas.get)


def review(board, reference, net):
    return f"""schema = 1
[board]
files = {json.dumps(str(board))}
[reference]
nets = [{json.dumps(reference)}]
[[net]]
name = {json.dumps(net)}
[[band]]
name = "HF"
"""


def png_size(path):
    data = path.read_bytes()
    assert data[:8] == b"\x89PNG\r\n\x1a\n"
    return struct.unpack(">II", data[16:24])


@pytest.mark.parametrize("board", BOARDS, ids=lambda path: path.name)
def test_look_and_draw(ebbmap, tmp_path, board):
    look = ebbmap.look(board)
    assert look["outline"]["area_mm2"] > 0 and look["nets"] and look["layers"]
    reference = largest_plane_net(look)
    nets = [net for net in look["nets"] if len(net["pins"]) == 2 and net["name"] != reference]
    nets.sort(key=lambda net: -net["track_length_mm"])
    path = tmp_path / "review.toml"
    drawable = None
    for net in nets[:TRIED]:
        path.write_text(review(board, reference, net["name"]))
        done = ebbmap.run("look", path, "--json", exits=(0, 2, 3))
        if done.returncode == 0:
            drawable = net["name"]
            break
        assert "error[" in done.stderr or "WITHHELD" in done.stdout or done.returncode == 3, done.stderr
    if drawable is None:
        # a board without a plane under any two-pin net: the last refusal must at least draw nothing and say why
        done = ebbmap.run("draw", path, "--out", tmp_path / "out", exits=(2, 3))
        assert "[" in done.stderr
        return
    done = ebbmap.run("draw", path, "--out", tmp_path / "out", "--numbers", exits=(0, 3))
    out = tmp_path / "out"
    if done.returncode == 3:
        # Known: the iteration stalls on six layers with two hundred capacitors. Then nothing may be drawn, and it is said.
        assert "error[solve-not-converged]" in done.stderr, done.stderr
        assert not list(out.glob("maps/*")), "no map is drawn from a solution that did not converge"
        return
    manifest = json.loads((out / "manifest.json").read_text())
    for entry in manifest["files"]:
        data = (out / entry["file"]).read_bytes()
        assert len(data) == entry["bytes"] and hashlib.sha256(data).hexdigest() == entry["sha256"]
    maps = [entry["file"] for entry in manifest["files"] if entry["file"].startswith("maps/")]
    assert len(maps) >= 2
    for name in maps:
        if name.endswith(".png"):
            assert png_size(out / name)[0] == 1600 and (out / name).stat().st_size <= 650_000
        else:
            assert ElementTree.parse(out / name).getroot().tag.endswith("svg")
            assert (out / name).stat().st_size <= 900_000
            assert str(tmp_path) not in (out / name).read_text()
    findings = json.loads((out / "findings.json").read_text())
    assert all(entry["withheld"] is None for entry in findings["maps"])
    for entry in Numbers(out / "numbers").maps():
        arrays = np.load(out / "numbers" / entry["file"])
        flow = np.hypot(abs(arrays["kx"]), abs(arrays["ky"]))
        assert flow[arrays["copper"]].max() > 0 and flow[~arrays["copper"]].max(initial=0) == 0
        assert entry["residual"] <= 1e-4
