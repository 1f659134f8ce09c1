"""Writes the fabrication files of plain boards: one straight track with planes over, under and beside it.

Gerber X2 (Ucamco, Gerber layer format specification) and XNC drill file (Ucamco, XNC format specification), written
by hand from the specifications, so that no code is shared with the project's own generator.
"""

from pathlib import Path

HEADER = "%FSLAX46Y46*%\n%MOMM*%\n%TF.GenerationSoftware,hand,check*%\n%TF.SameCoordinates,check*%\n"
DRILL_MM = 0.3


def _xy(x_mm, y_mm):
    return f"X{round(x_mm * 1e6)}Y{round(y_mm * 1e6)}"


def _rectangle(x0, y0, x1, y1):
    corners = [(x0, y0), (x1, y0), (x1, y1), (x0, y1), (x0, y0)]
    lines = [f"{_xy(*corners[0])}D02*"] + [f"{_xy(*corner)}D01*" for corner in corners[1:]]
    return "G01*\n" + "\n".join(lines) + "\n"


class Sheet:
    """One copper layer: what is drawn on it, in order. Lengths in mm."""

    def __init__(self):
        self._apertures = {}
        self._body = ""

    def _aperture(self, function, shape):
        code = self._apertures.setdefault((function, shape), 10 + len(self._apertures))
        return f"D{code}*\n"

    def fill(self, net, x0, y0, x1, y1):
        self._body += f"%TO.N,{net}*%\nG36*\n{_rectangle(x0, y0, x1, y1)}G37*\n%TD*%\n"

    def clear(self, x, y, diameter):
        self._body += f"%LPC*%\n{self._aperture('', f'C,{diameter:.4f}')}{_xy(x, y)}D03*\n%LPD*%\n"

    def track(self, net, width, x0, y0, x1, y1):
        self._body += f"%TO.N,{net}*%\n{self._aperture('Conductor', f'C,{width:.4f}')}G01*\n"
        self._body += f"{_xy(x0, y0)}D02*\n{_xy(x1, y1)}D01*\n%TD*%\n"

    def pad(self, net, pin, x, y, size, square=False):
        """A pad of a pin `U1.1`; round ones have a hole, square ones none."""
        function, shape = ("SMDPad,CuDef", f"R,{size:.4f}X{size:.4f}") if square else ("ComponentPad", f"C,{size:.4f}")
        part, number = pin.split(".")
        self._body += f"%TO.N,{net}*%\n%TO.P,{part},{number}*%\n{self._aperture(function, shape)}{_xy(x, y)}D03*\n%TD*%\n"

    def via(self, net, x, y, size):
        self._body += f"%TO.N,{net}*%\n{self._aperture('ViaPad', f'C,{size:.4f}')}{_xy(x, y)}D03*\n%TD*%\n"

    def text(self, number, of):
        side = "Top" if number == 1 else "Bot" if number == of else "Inr"
        text = HEADER + f"%TF.FileFunction,Copper,L{number},{side}*%\n%TF.FilePolarity,Positive*%\n"
        for (function, shape), code in self._apertures.items():
            named = f"%TA.AperFunction,{function}*%\n" if function else ""
            text += f"{named}%ADD{code}{shape}*%\n" + ("%TD*%\n" if named else "")
        return text + self._body + "M02*\n"


def write_set(folder, length_mm, width_mm, sheets, pins=(), vias=()):
    """Board from (0, 0) to (length, width) with copper `sheets` from the top; `pins` and `vias` are the places of plated
    holes of 0.3 mm through all layers."""
    folder = Path(folder)
    folder.mkdir(parents=True, exist_ok=True)
    for number, sheet in enumerate(sheets, 1):
        (folder / f"copper-{number}.gbr").write_text(sheet.text(number, len(sheets)))
    profile = HEADER + "%TF.FileFunction,Profile,NP*%\n%TA.AperFunction,Profile*%\n%ADD10C,0.0500*%\n%TD*%\nD10*\n"
    (folder / "profile.gbr").write_text(profile + _rectangle(0, 0, length_mm, width_mm) + "M02*\n")
    drill = f"M48\n; #@! TF.FileFunction,Plated,1,{len(sheets)},PTH\n; #@! TF.SameCoordinates,check\nMETRIC\n"
    drill += f"; #@! TA.AperFunction,Plated,PTH,ComponentDrill\nT1C{DRILL_MM:.3f}\n"
    drill += f"; #@! TA.AperFunction,Plated,PTH,ViaDrill\nT2C{DRILL_MM:.3f}\n" if vias else ""
    drill += "%\nG05\nT1\n" + "".join(f"X{x:.3f}Y{y:.3f}\n" for x, y in pins)
    drill += "T2\n" + "".join(f"X{x:.3f}Y{y:.3f}\n" for x, y in vias) if vias else ""
    (folder / "plated.drl").write_text(drill + "M30\n")


def write_board(folder, length_mm, width_mm, track_y_mm, track_width_mm, margin_mm, pad_mm=0.5, plane=True):
    """Two layers. The track runs at y = track_y from x = margin to length - margin between U1.1 and U2.1; U1.2 and
    U2.2 are plated holes on the plane, 1 mm beyond its ends. The plane fills the board."""
    start, end = margin_mm, length_mm - margin_mm
    reference = [(start - 1.0, track_y_mm, "U1.2"), (end + 1.0, track_y_mm, "U2.2")]
    top, bottom = Sheet(), Sheet()
    top.track("SIG", track_width_mm, start, track_y_mm, end, track_y_mm)
    top.pad("SIG", "U1.1", start, track_y_mm, track_width_mm, square=True)
    top.pad("SIG", "U2.1", end, track_y_mm, track_width_mm, square=True)
    if plane:
        bottom.fill("GND", 0, 0, length_mm, width_mm)
    for x, y, pin in reference:
        top.pad("GND", pin, x, y, pad_mm)
        bottom.pad("GND", pin, x, y, pad_mm)
    write_set(folder, length_mm, width_mm, [top, bottom], [(x, y) for x, y, _ in reference])


def write_pour_board(folder, length_mm, width_mm, track_width_mm, gap_mm, margin_mm, pad_mm=0.5):
    """Two layers. As `write_board` in the middle of the board, with a pour of GND on each side of the track at `gap`;
    both pours reach round the track's ends, and rows of vias there join them to the plane."""
    middle, start, end = width_mm / 2, margin_mm, length_mm - margin_mm
    top, bottom = Sheet(), Sheet()
    bottom.fill("GND", 0, 0, length_mm, width_mm)
    edge = track_width_mm / 2 + gap_mm
    # beyond the landings the pours meet, so that the joints lie behind the ends of the track
    close = [start - 0.6, end + 0.6]
    top.fill("GND", 0, middle + edge, length_mm, width_mm)
    top.fill("GND", 0, 0, length_mm, middle - edge)
    top.fill("GND", 0, middle - edge, close[0], middle + edge)
    top.fill("GND", close[1], middle - edge, length_mm, middle + edge)
    top.track("SIG", track_width_mm, start, middle, end, middle)
    top.pad("SIG", "U1.1", start, middle, track_width_mm, square=True)
    top.pad("SIG", "U2.1", end, middle, track_width_mm, square=True)
    pins = [(start - 1.0, middle, "U1.2"), (end + 1.0, middle, "U2.2")]
    for x, y, pin in pins:
        top.pad("GND", pin, x, y, pad_mm)
        bottom.pad("GND", pin, x, y, pad_mm)
    step = 2 * pad_mm
    rows = [middle + step * k for k in range(-int(middle / step) + 1, int(middle / step)) if k != 0]
    vias = [(x, y) for x in (start - 1.0, end + 1.0) for y in rows]
    for x, y in vias:
        top.via("GND", x, y, pad_mm)
        bottom.via("GND", x, y, pad_mm)
    write_set(folder, length_mm, width_mm, [top, bottom], [(x, y) for x, y, _ in pins], vias)


def write_supply_board(folder, length_mm, width_mm, track_width_mm, margin_mm, capacitors=0, pad_mm=0.5):
    """Three layers: ground plane GND, supply plane VCC, track on the bottom in the middle of the board. U1.2 and U2.2
    are plated pins on GND with an antipad in VCC. `capacitors` at each end (C1, C2 ...), in a column across the track's
    line: pin 1 on VCC, pin 2 on GND, both plated, each with an antipad in the other plane."""
    middle, start, end = width_mm / 2, margin_mm, length_mm - margin_mm
    ground, supply, bottom = Sheet(), Sheet(), Sheet()
    ground.fill("GND", 0, 0, length_mm, width_mm)
    supply.fill("VCC", 0, 0, length_mm, width_mm)
    bottom.track("SIG", track_width_mm, start, middle, end, middle)
    bottom.pad("SIG", "U1.1", start, middle, track_width_mm, square=True)
    bottom.pad("SIG", "U2.1", end, middle, track_width_mm, square=True)
    pins = [("GND", "U1.2", start - 1.0, middle), ("GND", "U2.2", end + 1.0, middle)]
    for number in range(2 * capacitors):
        side, place = number % 2, number // 2
        # beside the landing, alternately above and below the track's line
        y = middle + (1.2 + 1.2 * (place // 2)) * (1 if place % 2 == 0 else -1)
        x = start - 1.0 if side == 0 else end + 1.0
        away = -1.0 if side == 0 else 1.0
        pins += [("VCC", f"C{number + 1}.1", x, y), ("GND", f"C{number + 1}.2", x + away, y)]
    for net, _, x, y in pins:
        (supply if net == "GND" else ground).clear(x, y, pad_mm + 0.3)
    for net, pin, x, y in pins:
        (ground if net == "GND" else supply).pad(net, pin, x, y, pad_mm)
        bottom.pad(net, pin, x, y, pad_mm)
    write_set(folder, length_mm, width_mm, [ground, supply, bottom], [(x, y) for _, _, x, y in pins])


def write_review(path, height_mm, bands, cell_mm, model="sheet", nets=("SIG",), more=""):
    """A review of the board in `fab` beside it. `bands` are (name, frequency in Hz); `height_mm` has one value for each
    dielectric or one for a board of two layers; `more` is put before the bands."""
    heights = [height_mm] if isinstance(height_mm, (int, float)) else list(height_mm)
    copper = ", ".join(['"35um"'] * (len(heights) + 1))
    dielectric = ", ".join(f'"{height:.4f}mm"' for height in heights)
    text = 'schema = 1\n[board]\nfiles = "fab"\ntitle = "Straight track"\nrevision = "A"\n'
    text += f"[stackup]\ncopper = [{copper}]\ndielectric = [{dielectric}]\n"
    text += f"permittivity = [{', '.join(['4.2'] * len(heights))}]\n"
    text += '[reference]\nnets = ["GND"]\n'
    for net in nets:
        text += f'[[net]]\nname = "{net}"\ndriver = "U1.1"\nreceiver = "U2.1"\n'
    text += more
    for name, frequency in bands:
        low, high = frequency / 3, frequency * 3
        text += f'[[band]]\nname = "{name}"\nfrom = "{low:.3f}Hz"\nto = "{high:.3f}Hz"\nat = ["{frequency:.3f}Hz"]\n'
    text += f'[solver]\nmodel = "{model}"\ncell = "{cell_mm:.4f}mm"\n'
    Path(path).write_text(text)
