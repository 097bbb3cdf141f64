"""Truth is the lot's record, made by the verdict room; a browser's view of it is in look_at_pages.

What is checked here: a page holds the record's own numbers, nothing from outside becomes markup,
and nothing is fetched from anywhere.
"""

import re
from dataclasses import replace
from html.parser import HTMLParser
from xml.etree import ElementTree

import numpy as np
import pytest
from lot_example import ABOUT, HOSTILE, glances_of, lot_record

from imgcover.report.index_page import LotLine, index_page
from imgcover.report.layout import near
from imgcover.report.lot_page import lot_page
from imgcover.report.plot import LIMIT, Panel, Point, places_drawing


class Seen(HTMLParser):
    """Tags, attributes and text, as a browser would take them apart."""

    def __init__(self, page: str) -> None:
        super().__init__(convert_charrefs=True)
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.words = ""
        self.feed(page)

    def handle_starttag(self, tag, attrs):
        self.tags.append((tag, dict(attrs)))

    def handle_data(self, data):
        self.words += data


def flat(text: str) -> str:
    return re.sub(r"\s+", " ", text)


@pytest.fixture(scope="module")
def short():
    return lot_record("short")


def test_a_page_says_the_decision_the_numbers_and_the_limits_of_the_record(short):
    words = flat(Seen(lot_page(short, glances_of(short), about=ABOUT)).words)
    assert "✗ does not conform" in words
    picks = next(line for line in short["lines"] if line["quantity"] == "picks")
    u = picks["u"] * 2.54
    # the page speaks in inches, as the declaration does: 1 /cm is 2.54 /in
    for key in ("declared", "lower", "upper", "measured"):
        assert near(picks[key] * 2.54, u) in words
    assert "5 of 5 places" in words
    assert short["diagnosis"][0]["cause"] in words
    assert "made for this test" not in words and "plain sheeting" in words
    assert ABOUT.head in words
    assert "inspected by" in words


def test_every_picture_is_listed_with_its_findings_and_row(short):
    page = Seen(lot_page(short, glances_of(short), about=ABOUT))
    words = flat(page.words)
    for n in range(1, 6):
        assert f"scan-{n}.png" in words
    assert "the file is cut off" in words and "scan again" in words
    assert "few-pixels-a-thread" in words


def test_a_lot_with_nothing_declared_shows_its_means(short):
    bare = {**short, "lines": [], "decision": None, "diagnosis": [], "article": None}
    words = flat(Seen(lot_page(bare, [], about=ABOUT)).words)
    assert "nothing was declared" in words
    assert near(short["means"]["ends"]["value"] * 2.54, short["means"]["ends"]["u"] * 2.54) in words


def test_a_lot_of_which_nothing_was_measured_has_a_page(short):
    empty = {**short, "lines": [], "decision": None, "diagnosis": [], "means": {}, "places": []}
    assert "No place of this lot could be measured" in lot_page(empty, [], about=ABOUT)


def hostile_page(tmp_path) -> str:
    lot = {**lot_record("short", lot=HOSTILE), "article": HOSTILE}
    lot["findings"] = [{"code": "x", "severity": "info", "message": HOSTILE, "remedy": HOSTILE}]
    lot["diagnosis"] = [
        {
            **{"cause": HOSTILE, "weight": 0.5, "for": [HOSTILE], "against": [HOSTILE]},
            **{"settle": HOSTILE, "tied_with": [HOSTILE]},
        }
    ]
    return lot_page(lot, glances_of(lot, name=HOSTILE, small=tmp_path), about=ABOUT)


def test_nothing_from_outside_becomes_markup_or_steers(tmp_path):
    page = hostile_page(tmp_path)
    seen = Seen(page)
    images = [attributes for tag, attributes in seen.tags if tag == "img"]
    assert len(images) == 5
    assert all(each["src"].startswith("data:image/jpeg;base64,") for each in images)
    assert not any(name.startswith("on") for _, each in seen.tags for name in each)
    assert "script" not in {tag for tag, _ in seen.tags}
    assert "<img src=x onerror=alert(1)>\"'&{{7*7}}\\x1b[2J\\u202egnp" in seen.words
    assert "\x1b" not in page and "\u202e" not in page


def test_pages_fetch_nothing(tmp_path):
    lot = lot_record("good")
    first = index_page(
        [LotLine(lot=lot, units="inch", link="lots/4711.html")],
        title=HOSTILE,
        pictures=5,
        unread=0,
        notes=[HOSTILE],
        about=ABOUT,
    )
    for page in (hostile_page(tmp_path), first):
        for tag, attributes in Seen(page).tags:
            for name in ("src", "href", "xlink:href", "action", "data", "srcset"):
                where = attributes.get(name)
                assert where is None or where.startswith(("data:", "#", "lots/")), (tag, where)
        # names of the drawing's own vocabulary are no addresses that a browser visits
        assert not re.search(r"url\((?!#|\"#)|@import", page)
        assert "Content-Security-Policy" in page


def test_the_first_page_lists_lots_and_counts_decisions():
    lots = [lot_record(kind, lot=f"L{n}") for n, kind in enumerate(("good", "short", "good"))]
    lines = [LotLine(lot=lot, units="cm", link=f"lots/{lot['lot']}.html") for lot in lots]
    page = index_page(lines, title="april", pictures=15, unread=2, notes=["a note"], about=ABOUT)
    words = flat(Seen(page).words)
    assert "3 lots, 15 pictures, 2 of them not measured" in words
    assert "1 lot does not conform" in words
    assert [each["href"] for tag, each in Seen(page).tags if tag == "a"] == [
        "lots/L0.html",
        "lots/L1.html",
        "lots/L2.html",
    ]


def test_the_drawing_is_the_same_to_the_byte_and_true_to_its_own_axis():
    """Truth is geometry: every mark, read off against the axis's figures, is its value again."""
    panel = Panel(
        title="Ends",
        unit="/in",
        points=(Point(1, 68.0, 0.2), Point(2, 68.4, 0.2)),
        mean=68.2,
        mean_u=0.15,
        declared=68.0,
        lower=66.6,
        upper=None,
        accept_lower=66.9,
        accept_upper=None,
    )
    drawn = places_drawing([panel], places=2)
    assert drawn == places_drawing([panel], places=2)
    sheet = ElementTree.fromstring(drawn)
    figures = [
        (float(each.get("y")), float(each.text))
        for each in sheet.iter("text")
        if each.get("text-anchor") == "end"
    ]
    slope, start = np.polyfit(*zip(*figures, strict=True), 1)
    marked = [start + slope * float(each.get("cy")) for each in sheet.iter("circle")]
    # places are written to 0.01 points, some 0.0004 ends here
    assert marked == pytest.approx([68.0, 68.4], abs=0.001)
    red = [each.get("d") for each in sheet.iter("path") if each.get("stroke") == LIMIT]
    heights = [float(d.split()[1].split("L")[0]) for d in red]
    assert [start + slope * y for y in heights] == pytest.approx([66.6], abs=0.001)


def test_an_unreadable_declaration_is_not_told_as_none():
    bare = {**lot_record("good"), "article": None, "decision": None, "lines": []}
    for unread, said in (("", "nothing was declared"), ("<h>.toml", "<h>.toml could not be read")):
        page = lot_page(bare, [], about=replace(ABOUT, article_sha256="", unread=unread))
        assert said in flat(Seen(page).words)


def test_many_pictures_leave_a_page_of_bounded_size(tmp_path):
    lot = lot_record("good", places=90)
    page = lot_page(lot, glances_of(lot, small=tmp_path), about=ABOUT)
    shown = sum(tag == "img" for tag, _ in Seen(page).tags)
    assert shown == 40
    assert "50 more pictures are not shown" in flat(Seen(page).words)
