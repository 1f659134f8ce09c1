"""Writes the fabrication files of a plain two-layer board: one straight track over one rectangular plane.

Gerber X2 (Ucamco, Gerber layer format specification) and XNC drill file (Ucamco, XNC format specification), written
by hand from the specifications, so that no code is shared with the project's own generator.
"""

from pathlib import Path

HEADER = "%FSLAX46Y46*%\n%MOMM*%\n%TF.GenerationSoftware,hand,check*%\n%TF.SameCoordinates,check*%\n"


def _xy(x_mm, y_mm):
    return f"X{round(x_mm * 1e6)}Y{round(y_mm * 1e6)}"


def _rectangle(x0, y0, x1, y1):
    corners = [(x0, y0), (x1, y0), (x1, y1), (x0, y1), (x0, y0)]
    lines = [f"{_xy(*corners[0])}D02*"] + [f"{_xy(*corner)}D01*" for corner in corners[1:]]
    return "G01*\n" + "\n".join(lines) + "\n"


def _pad(code, net, pin, x, y):
    part, number = pin.split(".")
    return f"%TO.N,{net}*%\n%TO.P,{part},{number}*%\nD{code}*\n{_xy(x, y)}D03*\n%TD*%\n"


def write_board(folder, length_mm, width_mm, track_y_mm, track_width_mm, margin_mm, pad_mm=0.5, plane=True):
    """Board from (0, 0) to (length, width). The track runs at y = track_y from x = margin to length - margin between
    U1.1 and U2.1; U1.2 and U2.2 are plated holes on the plane, 1 mm beyond its ends. The plane fills the board."""
    folder = Path(folder)
    folder.mkdir(parents=True, exist_ok=True)
    start, end = margin_mm, length_mm - margin_mm
    reference = [(start - 1.0, track_y_mm, "U1.2"), (end + 1.0, track_y_mm, "U2.2")]
    top = HEADER + "%TF.FileFunction,Copper,L1,Top*%\n%TF.FilePolarity,Positive*%\n"
    top += f"%TA.AperFunction,Conductor*%\n%ADD10C,{track_width_mm:.4f}*%\n%TD*%\n"
    top += f"%TA.AperFunction,SMDPad,CuDef*%\n%ADD11R,{track_width_mm:.4f}X{track_width_mm:.4f}*%\n%TD*%\n"
    top += f"%TA.AperFunction,ComponentPad*%\n%ADD12C,{pad_mm:.4f}*%\n%TD*%\n"
    top += f"%TO.N,SIG*%\nD10*\nG01*\n{_xy(start, track_y_mm)}D02*\n{_xy(end, track_y_mm)}D01*\n%TD*%\n"
    top += _pad(11, "SIG", "U1.1", start, track_y_mm) + _pad(11, "SIG", "U2.1", end, track_y_mm)
    top += "".join(_pad(12, "GND", pin, x, y) for x, y, pin in reference) + "M02*\n"
    (folder / "copper-1.gbr").write_text(top)
    bottom = HEADER + "%TF.FileFunction,Copper,L2,Bot*%\n%TF.FilePolarity,Positive*%\n"
    bottom += f"%TA.AperFunction,ComponentPad*%\n%ADD12C,{pad_mm:.4f}*%\n%TD*%\n%TO.N,GND*%\n"
    if plane:
        bottom += "G36*\n" + _rectangle(0, 0, length_mm, width_mm) + "G37*\n"
    bottom += "%TD*%\n" + "".join(_pad(12, "GND", pin, x, y) for x, y, pin in reference) + "M02*\n"
    (folder / "copper-2.gbr").write_text(bottom)
    profile = HEADER + "%TF.FileFunction,Profile,NP*%\n%TA.AperFunction,Profile*%\n%ADD10C,0.0500*%\n%TD*%\nD10*\n"
    (folder / "profile.gbr").write_text(profile + _rectangle(0, 0, length_mm, width_mm) + "M02*\n")
    drill = "M48\n; #@! TF.FileFunction,Plated,1,2,PTH\n; #@! TF.SameCoordinates,check\nMETRIC\n"
    drill += "; #@! TA.AperFunction,Plated,PTH,ComponentDrill\nT1C0.300\n%\nG05\nT1\n"
    drill += "".join(f"X{x:.3f}Y{y:.3f}\n" for x, y, _ in reference) + "M30\n"
    (folder / "plated.drl").write_text(drill)


def write_review(path, height_mm, bands, cell_mm, model="sheet", nets=("SIG",)):
    """A review of the board in `fab` beside it. `bands` are (name, frequency in Hz)."""
    text = 'schema = 1\n[board]\nfiles = "fab"\ntitle = "Straight track"\nrevision = "A"\n'
    text += f'[stackup]\ncopper = ["35um", "35um"]\ndielectric = ["{height_mm:.4f}mm"]\npermittivity = [4.2]\n'
    text += '[reference]\nnets = ["GND"]\n'
    for net in nets:
        text += f'[[net]]\nname = "{net}"\ndriver = "U1.1"\nreceiver = "U2.1"\n'
    for name, frequency in bands:
        low, high = frequency / 3, frequency * 3
        text += f'[[band]]\nname = "{name}"\nfrom = "{low:.3f}Hz"\nto = "{high:.3f}Hz"\nat = ["{frequency:.3f}Hz"]\n'
    text += f'[solver]\nmodel = "{model}"\ncell = "{cell_mm:.4f}mm"\n'
    Path(path).write_text(text)
