"""The exports are the same bytes under another hash seed, in another process."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

_HERE = Path(__file__).parent
_SCRIPT = """
import hashlib, sys
sys.path[:0] = sys.argv[1:]
import drawn_sheets, drawn_networks
from gtfs_schematic.drawing.compose import compose
from gtfs_schematic.drawing.pdf import to_pdf
from gtfs_schematic.drawing.png import to_png
from gtfs_schematic.drawing.svg import to_svg
bundled = drawn_sheets.naive_bundle(drawn_sheets.on_page(drawn_networks.star()))
drawing = compose(drawn_sheets.naive_labels(bundled), drawn_sheets.SETTINGS)
for data in (to_svg(drawing), to_pdf(drawing), to_png(drawing, dpi=60)):
    print(hashlib.sha256(data).hexdigest())
"""


def test_bytes_do_not_hang_on_the_hash_seed():
    outputs = [
        subprocess.run(
            [sys.executable, "-c", _SCRIPT, str(_HERE.parent)],
            env={**os.environ, "PYTHONHASHSEED": seed},
            capture_output=True,
            text=True,
            check=True,
        ).stdout
        for seed in ("1", "20")
    ]
    assert len(outputs[0].split()) == 3
    assert outputs[0] == outputs[1]
