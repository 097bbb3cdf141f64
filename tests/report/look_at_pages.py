"""The pages as a browser shows and prints them: `python tests/report/look_at_pages.py [FOLDER]`.

Makes pages of a good lot, a short lot, a lot whose every name is hostile, and a first page, opens
them in headless Chromium, and checks what only a browser can tell: nothing is fetched, nothing
complains, nothing runs over the edge on a wide or a narrow screen, and print fills A4 sheets. The
pictures are left in FOLDER to be looked at. Part of .ci/run; needs `chromium`, so it is no test.
"""

from __future__ import annotations

import re
import shutil
import subprocess
import sys
import tempfile
from pathlib import Path

import numpy as np
from lot_example import ABOUT, HOSTILE, glances_of, lot_record
from PIL import Image

from imgcover.report.index_page import LotLine, index_page
from imgcover.report.lot_page import lot_page

BROWSERS = ("chromium", "chromium-browser", "google-chrome", "chrome")
QUIET = (
    *("--headless", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run"),
    *("--disable-background-networking", "--disable-component-update", "--disable-sync"),
    *("--hide-scrollbars", "--enable-logging=stderr", "--host-resolver-rules=MAP * ~NOTFOUND"),
)
A4 = (595, 842)
"""PDF points."""
MARGINS = {1000: (809, 856), 520: (503, 520)}
"""Pixel columns of the paper's right margin by width: 190 mm of paper in the middle with 14 mm of
margin, or the whole window with 5 mm; at 96 pixels an inch, less a pixel of rounding."""
MOST_SHEETS = {"good": 4, "short": 4, "hostile": 20, "report": 2}


def pages(folder: Path) -> dict[str, Path]:
    """Write the pages to look at."""
    good, short = lot_record("good"), lot_record("short", lot="4712")
    bad = {**lot_record("short", lot=HOSTILE * 3, places=60), "article": HOSTILE}
    lots = [LotLine(lot=lot, units="inch", link="good.html") for lot in (good, short, bad)]
    made = {
        "good": lot_page(good, glances_of(good, small=folder), about=ABOUT),
        "short": lot_page(short, glances_of(short, small=folder), about=ABOUT),
        "hostile": lot_page(bad, glances_of(bad, name=HOSTILE * 2, small=folder), about=ABOUT),
        "report": index_page(
            lots, title=HOSTILE, pictures=72, unread=3, notes=[HOSTILE * 5], about=ABOUT
        ),
    }
    for name, text in made.items():
        (folder / f"{name}.html").write_text(text, encoding="utf-8")
    return {name: folder / f"{name}.html" for name in made}


class Browser:
    """Headless Chromium with a profile of its own."""

    def __init__(self, program: str, profile: Path) -> None:
        self._command = [program, *QUIET, f"--user-data-dir={profile}"]

    def open(self, page: Path, *options: str) -> list[str]:
        """Open a page; says what it complained of, such as a fetch that its own policy forbids."""
        done = subprocess.run(
            [*self._command, *options, page.as_uri()],
            capture_output=True,
            text=True,
            check=False,
            timeout=120,
        )
        return [line for line in done.stderr.splitlines() if "CONSOLE" in line]


def looked(browser: Browser, name: str, page: Path) -> list[str]:
    """Look at a page on two screens and on paper; says what is wrong."""
    wrong = []
    for width in MARGINS:  # a desk's screen, and the narrowest window that the browser opens
        picture = page.with_name(f"{name}-{width}.png")
        shot = (f"--window-size={width},3000", f"--screenshot={picture}")
        wrong += browser.open(page, *shot)
        pixels = np.asarray(Image.open(picture).convert("RGB"))
        if pixels.reshape(-1, 3).std() < 5:
            wrong.append(f"{picture.name} is empty")
        margin = pixels[:, slice(*MARGINS[width])]
        if margin.std(axis=1).max() > 0:
            wrong.append(f"{picture.name} runs into its right margin")
    paper = page.with_suffix(".pdf")
    wrong += browser.open(page, "--no-pdf-header-footer", f"--print-to-pdf={paper}")
    text = paper.read_bytes().decode("latin-1")
    boxes = re.findall(r"/MediaBox \[0 0 ([\d.]+) ([\d.]+)\]", text)
    if {(round(float(w)), round(float(h))) for w, h in boxes} != {A4}:
        wrong.append(f"{paper.name} is not A4: {set(boxes)}")
    if not 1 <= len(boxes) <= MOST_SHEETS[name]:
        wrong.append(f"{paper.name} takes {len(boxes)} sheets")
    return [f"{name}: {each}" for each in wrong]


def main() -> int:
    """Look at all of them."""
    program = next(filter(None, map(shutil.which, BROWSERS)), None)
    if program is None:
        sys.stderr.write("no Chromium is installed: apt-get install chromium\n")
        return 2
    with tempfile.TemporaryDirectory() as scratch:
        folder = Path(sys.argv[1]) if len(sys.argv) > 1 else Path(scratch) / "pages"
        folder.mkdir(parents=True, exist_ok=True)
        browser = Browser(program, Path(scratch) / "profile")
        (Path(scratch) / "profile").mkdir()
        wrong = []
        for name, page in pages(folder.resolve()).items():
            wrong += looked(browser, name, page)
    for each in wrong:
        sys.stdout.write(f"{each}\n")
    sys.stdout.write(f"{len(MOST_SHEETS)} pages looked at, {len(wrong)} faults\n")
    return 1 if wrong else 0


if __name__ == "__main__":
    sys.exit(main())
