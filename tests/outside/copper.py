"""Copper of one Gerber file composed with two general-purpose libraries: gerbonara reads, Shapely composes.

Works from the file alone; nothing of ebbmap is used. Arcs become chords with a sagitta below 0.5 um.
"""

import math
import re
import warnings
from pathlib import Path

from gerbonara import ExcellonFile, GerberFile
from gerbonara.graphic_objects import Arc, Flash, Line, Region
from gerbonara.utils import MM
from shapely import Polygon, affinity, box, unary_union
from shapely.geometry import LineString, Point

SAGITTA_MM = 0.5e-3


def file_function(path):
    """Fields of the first TF.FileFunction attribute of a file, in either spelling."""
    text = Path(path).read_text(encoding="utf-8", errors="replace")
    found = re.search(r"TF\.FileFunction,([^*\n]*)", text)
    return found.group(1).split(",") if found else []


def copper_files(folder):
    """{layer number from 1 at the top: path} of the copper files of a folder."""
    found = {}
    for path in sorted(Path(folder).rglob("*")):
        if path.is_file() and path.suffix.lower() not in {".zip", ".toml", ".json", ".png", ".gbrjob"}:
            fields = file_function(path)
            if fields[:1] == ["Copper"]:
                found[int(fields[1][1:])] = path
    return found


def drill_files(folder):
    """Paths of the drill files of a folder."""
    suffixes = {".drl", ".xnc", ".txt"}
    return [path for path in sorted(Path(folder).rglob("*")) if path.suffix.lower() in suffixes and path.is_file()]


def read_gerber(path):
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        return GerberFile.open(path)


def read_drill(path):
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        return ExcellonFile.open(path)


def counts(gerber):
    """Numbers of draws (lines and arcs), flashes and regions of a file."""
    kinds = {"draws": (Line, Arc), "flashes": (Flash,), "regions": (Region,)}
    return {name: sum(isinstance(thing, kind) for thing in gerber.objects) for name, kind in kinds.items()}


def _arc_points(start, end, centre, clockwise):
    radius = math.dist(start, centre)
    if radius <= 0:
        return [end]
    a0 = math.atan2(start[1] - centre[1], start[0] - centre[0])
    a1 = math.atan2(end[1] - centre[1], end[0] - centre[0])
    sweep = a1 - a0
    if clockwise:
        sweep = sweep - 2 * math.pi if sweep >= -1e-12 else sweep
        while sweep < -2 * math.pi:
            sweep += 2 * math.pi
    else:
        sweep = sweep + 2 * math.pi if sweep <= 1e-12 else sweep
        while sweep > 2 * math.pi:
            sweep -= 2 * math.pi
    step = 2 * math.acos(max(0.0, 1 - SAGITTA_MM / radius)) if radius > SAGITTA_MM else math.pi / 4
    count = max(2, math.ceil(abs(sweep) / step))
    points = [
        (centre[0] + radius * math.cos(a0 + sweep * i / count), centre[1] + radius * math.sin(a0 + sweep * i / count))
        for i in range(1, count)
    ]
    return points + [end]


def _polygon(arc_poly):
    points = [arc_poly.outline[0]]
    for start, end, (clockwise, centre) in arc_poly.segments:
        if clockwise is None:
            points.append(end)
        else:
            points.extend(_arc_points(start, end, centre, clockwise))
    if len(points) < 4:
        return Polygon()
    return Polygon(points).buffer(0)


def _shape(primitive):
    """Shapely shape of one primitive in mm. Round pens as buffers, the rest as polygons."""
    name = type(primitive).__name__
    if name == "Circle":
        segments = max(8, math.ceil(math.pi / (4 * math.acos(max(0.0, 1 - SAGITTA_MM / max(primitive.r, 2e-3))))))
        return Point(primitive.x, primitive.y).buffer(primitive.r, quad_segs=segments)
    if name in ("Line", "Arc"):
        radius = primitive.width / 2
        start, end = (primitive.x1, primitive.y1), (primitive.x2, primitive.y2)
        path = [start, end]
        if name == "Arc":
            path = [start] + _arc_points(start, end, (primitive.cx, primitive.cy), primitive.clockwise)
        segments = max(8, math.ceil(math.pi / (4 * math.acos(max(0.0, 1 - SAGITTA_MM / max(radius, 2e-3))))))
        if math.dist(start, end) == 0 and name == "Line":
            return Point(start).buffer(radius, quad_segs=segments)
        return LineString(path).buffer(radius, quad_segs=segments)
    if name == "Rectangle":  # its own polygon is wrong when it is turned (gerbonara 1.5.0); its SVG turns it so:
        w, h = primitive.w / 2, primitive.h / 2
        upright = box(primitive.x - w, primitive.y - h, primitive.x + w, primitive.y + h)
        return affinity.rotate(upright, primitive.rotation, origin=(primitive.x, primitive.y), use_radians=True)
    return _polygon(primitive.to_arc_poly())


def compose(gerber):
    """Copper of a file in mm: dark objects added, clear objects taken off what lies before them."""
    copper = Polygon()
    run, run_is_dark = [], True

    def close_run():
        nonlocal copper
        if run:
            joined = unary_union(run)
            copper = copper.union(joined) if run_is_dark else copper.difference(joined)
            run.clear()

    for thing in gerber.objects:
        for primitive in thing.to_primitives(MM):
            if primitive.polarity_dark != run_is_dark:
                close_run()
                run_is_dark = primitive.polarity_dark
            shape = _shape(primitive)
            if not shape.is_empty:
                run.append(shape)
    close_run()
    return copper


def largest_region(gerber):
    """Area in mm2 and number of holes of the largest G36 region of a file, cut-ins resolved; none without regions."""
    shapes = [_polygon(p) for thing in gerber.objects if isinstance(thing, Region) for p in thing.to_primitives(MM)]
    if not shapes:
        return None
    shape = max(shapes, key=lambda shape: shape.area)
    pieces = getattr(shape, "geoms", [shape])
    return shape.area, sum(len(piece.interiors) for piece in pieces)
