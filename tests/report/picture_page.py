"""The README's picture of a lot's page, taken anew: `python tests/report/picture_page.py`."""

from __future__ import annotations

import shutil
import subprocess
import sys
import tempfile
from pathlib import Path

from look_at_pages import BROWSERS, Browser
from PIL import Image

ROOT = Path(__file__).resolve().parent.parent.parent
LOT = "R5102"
"""The lot that was woven with too few picks."""
SEEN = (100, 20, 900, 1010)
"""The piece of the page that the README shows, px: decision, figures, places against limits."""
COLOURS = 160
"""Enough for a page of text and lines, and half of the bytes."""


def main() -> int:
    """Audit the samples, open the lot's page, keep the piece."""
    program = next(filter(None, map(shutil.which, BROWSERS)), None)
    if program is None:
        sys.stderr.write("no Chromium is installed: apt-get install chromium\n")
        return 2
    with tempfile.TemporaryDirectory() as scratch:
        out, shot = Path(scratch) / "out", Path(scratch) / "shot.png"
        audit = ["audit", str(ROOT / "samples-synthetic"), "--out", str(out)]
        subprocess.run([sys.executable, "-m", "imgcover", *audit], check=False)
        browser = Browser(program, Path(scratch))
        page = out / "lots" / f"{LOT}.html"
        browser.open(page, "--window-size=1000,1400", f"--screenshot={shot}")
        piece = Image.open(shot).convert("RGB").crop(SEEN)
    target = ROOT / ".readme" / "lot-page.png"
    target.parent.mkdir(exist_ok=True)
    piece.quantize(COLOURS).save(target, optimize=True)
    return 0


if __name__ == "__main__":
    sys.exit(main())
