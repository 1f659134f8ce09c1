"""The SVG files in a second renderer, headless Chromium, against the PNG files that ebbmap writes; links followed by
clicks from the contact sheet to every map and back.

Both pictures are turned to gray (Rec. 709 luma). Bounds: mean difference at most 4 of 255, and structural similarity
(Wang et al., IEEE T-IP 13(4), 2004, with an 8 x 8 window, from memory) at least 0.95 over the page. Two renderers smooth
edges and letters differently (measured: up to 3.0 and down to 0.956), so pixels may differ; the same page two pixels lower
(at most 0.932) or without the third of it that holds most must break the bounds, which each check shows. Without a
browser nothing of this is checked.
"""

import io
import json

import numpy as np
import pytest
from PIL import Image
from scipy.ndimage import uniform_filter

from browser import Browser, find
from gerber_board import write_board, write_review

MEAN = 4.0
STRUCTURE = 0.95
PROGRAM = find()

pytestmark = pytest.mark.skipif(
    PROGRAM is None, reason="no Chromium found (Debian package `chromium`, or EBBMAP_BROWSER): second renderer not checked"
)


def gray(data):
    rgb = np.asarray(Image.open(io.BytesIO(data)).convert("RGB"), dtype=float)
    return rgb @ np.array([0.2126, 0.7152, 0.0722])


def mean_difference(a, b):
    return np.abs(a - b).mean()


def structure(a, b, window=8):
    """Mean structural similarity of two gray pictures."""
    c1, c2 = (0.01 * 255) ** 2, (0.03 * 255) ** 2
    mean = lambda x: uniform_filter(x, window)  # noqa: E731
    ma, mb = mean(a), mean(b)
    va, vb, cab = mean(a * a) - ma * ma, mean(b * b) - mb * mb, mean(a * b) - ma * mb
    return (((2 * ma * mb + c1) * (2 * cab + c2)) / ((ma * ma + mb * mb + c1) * (va + vb + c2))).mean()


@pytest.fixture(scope="module")
def drawn(ebbmap, tmp_path_factory):
    folder = tmp_path_factory.mktemp("browser")
    write_board(folder / "fab", 60, 20, 10.0, 0.4, 6)
    write_review(folder / "review.toml", 0.2, [("B0", 1e5), ("B1", 1e7)], 0.4)
    for style in ("paper", "screen"):
        ebbmap.run("draw", "review.toml", "--out", style, "--style", style, cwd=folder)
        ebbmap.run("look", "review.toml", "--picture", style, "--style", style, cwd=folder)
    return folder


def rendered(drawn, tmp_path, svg):
    """Screenshot of an SVG at the size of the PNG beside it, and that PNG, both gray."""
    png = gray(svg.with_suffix(".png").read_bytes())
    height, width = png.shape
    browser = Browser(PROGRAM, tmp_path / "profile", width, height)
    try:
        page = tmp_path / "page.html"
        uri = svg.resolve().as_uri()
        page.write_text(
            f'<body style="margin:0"><img src="{uri}" style="display:block;width:{width}px;height:{height}px"></body>'
        )
        browser.open(page)
        assert browser.evaluate("document.images[0].decode().then(() => document.images[0].naturalWidth)") > 0
        shot = gray(browser.screenshot())
    finally:
        browser.close()
    assert shot.shape == png.shape
    return shot, png


@pytest.mark.parametrize("style", ["paper", "screen"])
@pytest.mark.parametrize("kind", ["maps/*.svg", "contact-sheet-1.svg", "layer-1.svg"])
def test_same_picture(drawn, tmp_path, style, kind):
    svg = sorted((drawn / style).glob(kind))[-1]
    shot, png = rendered(drawn, tmp_path, svg)
    difference, similar = mean_difference(shot, png), structure(shot, png)
    print(f"{style} {svg.name}: mean difference {difference:.2f}, structure {similar:.4f}")
    assert difference <= MEAN and similar >= STRUCTURE, (svg.name, difference, similar)
    moved = np.roll(png, 2, axis=0)
    blank = png.copy()
    third = png.shape[0] // 3
    ink = np.abs(png - png[0, 0]).sum(axis=1)
    start = max(range(0, png.shape[0] - third, 10), key=lambda row: ink[row : row + third].sum())
    blank[start : start + third] = png[0, 0]
    for wrong in (moved, blank):
        assert mean_difference(shot, wrong) > MEAN or structure(shot, wrong) < STRUCTURE


def test_links(drawn, tmp_path):
    """Every map of the contact sheet is reached by a click in the sheet itself, and the map's headline leads back."""
    out = drawn / "paper"
    maps = sorted(entry["svg"] for entry in json.loads((out / "findings.json").read_text())["maps"])
    centre = """(() => {{
        const found = [...document.querySelectorAll('a')].filter(a => new URL(a.href.baseVal, location).pathname.endsWith({name}));
        if (!found.length) return null;
        const box = found[0].getBoundingClientRect();
        return [box.x + box.width / 2, box.y + box.height / 2];
    }})()"""
    browser = Browser(PROGRAM, tmp_path / "profile", 1700, 1200)
    try:
        for name in maps:
            browser.open(out / "contact-sheet-1.svg")
            spot = browser.evaluate(centre.format(name=json.dumps(name)))
            assert spot, f"the contact sheet has no link to {name}"
            browser.click(*spot)
            assert browser.evaluate("location.pathname").endswith(name)
            back = browser.evaluate(centre.format(name=json.dumps("contact-sheet-1.svg")))
            assert back, f"{name} has no link to the contact sheet"
            browser.click(*back)
            assert browser.evaluate("location.pathname").endswith("contact-sheet-1.svg")
    finally:
        browser.close()
    assert len(maps) == 2
