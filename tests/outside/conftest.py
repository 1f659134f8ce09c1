"""Where the checks find the program, and how they run it."""

import json
import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")  # small dense systems: threads cost more than they give

import subprocess
from pathlib import Path

import numpy as np
import pytest

ROOT = Path(__file__).resolve().parents[2]
PROGRAM = Path(os.environ.get("EBBMAP", ROOT / "target" / "release" / "ebbmap")).resolve()


class Program:
    """Runs `ebbmap` and keeps what it said."""

    def run(self, *arguments, cwd=None, exits=(0,)):
        done = subprocess.run([PROGRAM, *map(str, arguments)], cwd=cwd, capture_output=True, text=True, timeout=1200)
        command = " ".join(map(str, arguments))
        assert done.returncode in exits, f"ebbmap {command}: exit {done.returncode}\n{done.stdout}\n{done.stderr}"
        return done

    def look(self, path, exits=(0, 3)):
        """What `look --json` says of a board."""
        return json.loads(self.run("look", path, "--json", exits=exits).stdout)


@pytest.fixture(scope="session")
def ebbmap():
    assert PROGRAM.exists(), f"{PROGRAM} is not built"
    return Program()


class Numbers:
    """The arrays of a `--numbers` folder, read with NumPy alone."""

    def __init__(self, folder):
        self.folder = Path(folder)
        self.index = json.loads((self.folder / "index.json").read_text())

    def maps(self):
        return self.index["maps"]

    def load(self, entry):
        """Densities (kx, ky) of one map, complex, shape (ny, nx), row 0 at the bottom."""
        return np.load(self.folder / entry["file"])
