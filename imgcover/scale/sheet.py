"""The printed scale sheet: what is on it, and how is it drawn?

A square field of numbered corners (an OpenCV ChArUco board) that can be found in part and at any
turn, and two bars to be measured with a steel rule after printing, since no printer keeps its
scale. Everything on the field lies on a half-millimetre grid, so that it is drawn as rectangles.
"""

from __future__ import annotations

import io
import math
from dataclasses import dataclass
from functools import cache
from typing import TYPE_CHECKING, Any, Literal

import cv2
import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from matplotlib.axes import Axes

SHEET_NAME = "imgcover sheet 1"
PAGE_MM = (210.0, 297.0)
SQUARES = 17
"""A side; odd, so that the field looks the same in all versions of the board's definition."""
SQUARE_MM = 10.0
MARKER_MM = 7.0
"""Seven modules of 1 mm: eight pixels each at 200 dpi."""
FIELD_MM = SQUARES * SQUARE_MM
FIELD_AT_MM = (28.0, 12.0)
"""From the page's left and top edge: clear of what home printers leave blank."""
BAR_A_MM = 180.0
"""Across the page."""
BAR_B_MM = 260.0
"""Down the page."""
CUT_MM = 205.0
"""Above this line the page is cut for beds on which it does not fit both ways."""

Kind = Literal["pdf", "svg", "png"]


@dataclass(frozen=True, slots=True)
class Bars:
    """What a steel rule says of the two bars of one printed sheet, in mm.

    Parameters
    ----------
    a, b : float
        Lengths of the bar across and the bar down the page, between the middles of their ends.
    u : float
        Standard uncertainty of each reading, the rule's own class included.

    Raises
    ------
    ValueError
        When a length is more than 8 % from what was drawn: no printer is that far off, and a
        sheet that was shrunk so far was not printed at 100 %.
    """

    a: float
    b: float
    u: float

    def __post_init__(self) -> None:
        for name, value, drawn in (("a", self.a, BAR_A_MM), ("b", self.b, BAR_B_MM)):
            if not abs(value / drawn - 1) < 0.08:
                raise ValueError(f"bar {name} is drawn {drawn:g} mm long, got {value:g} mm")
        if not 0 < self.u < 5:
            raise ValueError(f"u must be a positive length in mm, got {self.u}")

    @property
    def stretch(self) -> tuple[float, float]:
        """By how much the sheet came out larger than drawn, across and down."""
        return self.a / BAR_A_MM, self.b / BAR_B_MM

    @property
    def u_stretch(self) -> tuple[float, float]:
        """Relative standard uncertainties of both."""
        return self.u / self.a, self.u / self.b


@cache
def board() -> cv2.aruco.CharucoBoard:
    """Return the field as OpenCV knows it."""
    dictionary = cv2.aruco.getPredefinedDictionary(cv2.aruco.DICT_5X5_250)
    return cv2.aruco.CharucoBoard((SQUARES, SQUARES), SQUARE_MM, MARKER_MM, dictionary)


def corners_mm() -> NDArray[np.float64]:
    """Return where the numbered corners are drawn, shape (256, 2): mm from the page's corner."""
    field = np.asarray(board().getChessboardCorners(), dtype=np.float64)[:, :2]
    return np.asarray(field + np.array(FIELD_AT_MM), dtype=np.float64)


def draw_sheet(kind: Kind, *, dpi: int = 600) -> bytes:
    """Draw the sheet on an A4 page.

    Parameters
    ----------
    kind : {"pdf", "svg", "png"}
        Format of the file.
    dpi : int
        Resolution of a png.

    Returns
    -------
    bytes
        The file, the same on every call.
    """
    import matplotlib
    from matplotlib.figure import Figure

    with matplotlib.rc_context({"svg.hashsalt": SHEET_NAME, "pdf.fonttype": 42}):
        width, height = (math.ceil(side * dpi / 25.4) / dpi for side in PAGE_MM)
        if kind != "png":
            width, height = PAGE_MM[0] / 25.4, PAGE_MM[1] / 25.4
        figure = Figure(figsize=(width, height))
        axes = figure.add_axes((0.0, 0.0, 1.0, 1.0))
        # a png has whole pixels: the page is let run a little over, not squeezed into them
        axes.set_xlim(0, width * 25.4)
        axes.set_ylim(height * 25.4, 0)
        axes.axis("off")
        _draw_field(axes)
        _draw_bars(axes)
        _write(axes)
        file = io.BytesIO()
        dates = {"pdf": {"CreationDate": None}, "svg": {"Date": None}, "png": {}}
        figure.savefig(file, format=kind, dpi=dpi, metadata=dates[kind])
    return file.getvalue()


def _draw_field(axes: Axes) -> None:
    """Draw the field's black cells as rows and as columns: the overlap leaves no seams."""
    from matplotlib.collections import PolyCollection

    cells = round(2 * FIELD_MM)
    black = np.asarray(board().generateImage((cells, cells), None, 0, 1)) < 128
    left, top = FIELD_AT_MM
    rectangles = [
        (left + x0 / 2, top + y0 / 2, left + x1 / 2, top + y1 / 2)
        for turned in (False, True)
        for y0, y1, x0, x1 in _runs(black, turned=turned)
    ]
    shapes = [[(x0, y0), (x1, y0), (x1, y1), (x0, y1)] for x0, y0, x1, y1 in rectangles]
    field = PolyCollection(shapes, facecolor="black", edgecolor="none")
    field.set_snap(False)  # edges rounded to whole pixels would stretch the field
    axes.add_collection(field)


def _runs(black: NDArray[np.bool_], *, turned: bool) -> list[tuple[int, int, int, int]]:
    """List the black runs along rows (or columns), equal ones in a row joined.

    Each is (first row, end row, first column, end column).
    """
    field = black.T if turned else black
    found: list[tuple[int, int, int, int]] = []
    last: dict[tuple[int, int], int] = {}
    for row, line in enumerate(field):
        edges = np.flatnonzero(np.diff(np.concatenate([[0], line.astype(int), [0]])))
        runs = [(start, end) for start, end in edges.reshape(-1, 2).tolist()]
        begun = {run: last.get(run, row) for run in runs}
        found += [(first, row, *run) for run, first in last.items() if run not in begun]
        last = begun
    found += [(first, len(field), *run) for run, first in last.items()]
    return [(x0, x1, y0, y1) for y0, y1, x0, x1 in found] if turned else found


def _draw_bars(axes: Axes) -> None:
    """Draw the bars: a thin line between two thin end lines, measured from middle to middle."""
    line: dict[str, Any] = {
        "color": "black",
        "linewidth": 0.5,
        "solid_capstyle": "butt",
        "snap": False,
    }
    y, x0 = 196.0, 15.0
    axes.plot([x0, x0 + BAR_A_MM], [y, y], **line)
    for x in (x0, x0 + BAR_A_MM):
        axes.plot([x, x], [y - 4, y + 4], **line)
    x, y0 = 12.0, 15.0
    axes.plot([x, x], [y0, y0 + BAR_B_MM], **line)
    for y in (y0, y0 + BAR_B_MM):
        axes.plot([x - 4, x + 4], [y, y], **line)


def _write(axes: Axes) -> None:
    axes.text(105, 193.5, "bar A", ha="center", fontsize=8)
    axes.text(15.5, 146, "bar B", rotation=90, va="center", fontsize=8)
    axes.plot([0, 210], [CUT_MM, CUT_MM], color="black", linewidth=0.3, linestyle=(0, (2, 4)))
    axes.text(205, CUT_MM + 3.5, "cut here if the bed is too narrow for a turn", ha="right", size=6)
    lines = (
        SHEET_NAME,
        "1  Print at 100 %, not fitted to the page, on stiff smooth paper. Do not copy it.",
        f"2  Measure bar A ({BAR_A_MM:g} mm as drawn) and bar B ({BAR_B_MM:g} mm as drawn) with a"
        " steel rule,",
        "    from the middle of one end line to the middle of the other, to a tenth of a mm:",
        "    A  ______________ mm      B  ______________ mm      rule  ______________",
        "3  Lay it face down on the clean glass, straight, and scan it at the resolution you use.",
        "4  Turn it a quarter and scan again. On a large bed scan both ends as well.",
        "5  imgcover calibrate read scan1.png scan2.png --bars A,B --name NAME -o NAME.toml",
    )
    for index, words in enumerate(lines):
        axes.text(24, 217 + 7 * index, words, fontsize=12 if index == 0 else 9)


__all__ = [
    "BAR_A_MM",
    "BAR_B_MM",
    "PAGE_MM",
    "SHEET_NAME",
    "SQUARE_MM",
    "Bars",
    "Kind",
    "board",
    "corners_mm",
    "draw_sheet",
]
