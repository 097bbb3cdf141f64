"""An article file is read whole or refused with path, expectation and nearest spelling.

Truth is the contract: each fault below is planted in a sheet that reads well without it.
"""

from __future__ import annotations

import hashlib
import json
import os
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from imgcover.cloth.declaration import LARGEST_FILE, Declaration, State, read_declaration
from imgcover.cloth.prediction import predict
from imgcover.cloth.reference import reference_table
from imgcover.errors import DeclarationError
from imgcover.quantity import Measured

SHEET = """\
[article]
code = "VELA-7"
description = "fine plain cloth"
weave = "plain"
state = "finished"
[warp]
threads = "68 /in"
count = "32 Ne"
fibre = "cotton"
crimp = "6 %"
[weft]
threads = "252 /10cm"
count = "2/64 Ne"
[tolerance]
ends = "2 %"
picks = "-2 % +5 %"
cover = "4 points"
mass = "5 %"
[cover]
declared = 0.66
[mass]
declared = "99 g/m2"
finish_change = "-4 %"
[reference]
optical_cover = "0.812 u 0.004"
warp_cover = { value = 0.5, u = 0.01 }
"""


def read(text: str) -> Declaration:
    return read_declaration(text.encode(), name="vela.toml")


def test_a_whole_sheet_is_read() -> None:
    sheet = read(SHEET)
    assert sheet.article.code == "VELA-7"
    assert sheet.article.state is State.FINISHED
    assert sheet.warp.threads.per_inch == pytest.approx(68)
    assert sheet.weft.threads.per_cm == pytest.approx(25.2)
    assert (sheet.weft.count.plies, round(sheet.weft.count.ne, 9)) == (2, 32)
    assert sheet.cover.declared == 0.66
    assert sheet.mass.declared == 99
    assert sheet.reference.optical_cover == Measured(0.812, 0.004, "1")
    assert sheet.reference.warp_cover == Measured(0.5, 0.01, "1")
    assert sheet.reference.weft_cover is None
    assert sheet.sha256 == hashlib.sha256(SHEET.encode()).hexdigest()


def test_the_least_sheet_is_read_from_a_file(tmp_path: Path) -> None:
    least = '[article]\ncode="A"\n[warp]\nthreads="20 /cm"\ncount="30 tex"\n'
    least += '[weft]\nthreads="18 /cm"\ncount="30 tex"\n'
    path = tmp_path / "least.toml"
    path.write_bytes(b"\xef\xbb\xbf" + least.encode())
    sheet = read_declaration(path)
    assert sheet.name == "least.toml"
    assert (sheet.tolerance.ends, sheet.mass.declared, sheet.article.weave) == (None, None, None)


def test_plies_written_apart_are_folded_into_the_count() -> None:
    sheet = read(SHEET.replace('count = "32 Ne"', 'count = "8 Ne"\nplies = 2'))
    assert sheet.warp.count.ne == pytest.approx(4)


FAULTS = [
    # what stands in the sheet, what is planted, path, words of the refusal
    ('threads = "68 /in"', "threads = 68", "warp.threads", "unit is missing"),
    ('threads = "68 /in"', 'threads = "68"', "warp.threads", '"/in", "/cm", "/10cm"'),
    ('threads = "68 /in"', 'threads = "-68 /in"', "warp.threads", "0.5 to 250"),
    ('threads = "68 /in"', 'threads = "6800 /in"', "warp.threads", "no cloth has"),
    ('threads = "68 /in"', 'thread = "68 /in"', "warp.thread", 'valid key: "threads"'),
    ('threads = "68 /in"', 'x = "68 /in"', "warp.x", "valid keys here"),
    ('threads = "68 /in"\n', "", "warp.threads", 'add threads = "68 /in"'),
    ('threads = "68 /in"', 'threads = ["68 /in"]', "warp.threads", "a list"),
    ('threads = "68 /in"', 'threads = "68 /in u 1 /in"', "warp.threads", "[tolerance]"),
    ('threads = "68 /in"', "threads = 2020-01-01", "warp.threads", "a date"),
    ('count = "32 Ne"', 'count = "-32 Ne"', "warp.count", "above zero"),
    ('count = "32 Ne"', 'count = "32"', "warp.count", "none is guessed"),
    ('count = "32 Ne"', 'count = "2/12 Ne"', "warp.count", "write plies"),
    ('count = "32 Ne"', 'count = "2/40 Ne"\nplies = 3', "warp.count", "agree"),
    ('fibre = "cotton"', "plies = 2.0", "warp.plies", "whole number"),
    ('fibre = "cotton"', "plies = 0", "warp.plies", "1 to 24"),
    ('fibre = "cotton"', 'fibre = "coton"', "warp.fibre", "nearest: cotton"),
    ('fibre = "cotton"', 'fibre = "cotton 60 %, wool 30 %"', "warp.fibre", "100 %"),
    ('fibre = "cotton"', 'fibre = "cotton 60, wool 40"', "warp.fibre", "blend"),
    ('fibre = "cotton"', 'spinning = "rotors"', "warp.spinning", "nearest: rotor"),
    ('fibre = "cotton"', "packing = 60", "warp.packing", "0.1 to 1"),
    ('fibre = "cotton"', 'packing = "0.6 u 0.7"', "warp.packing", "third"),
    ('fibre = "cotton"', 'yarn_density = "0.9"', "warp.yarn_density", "unit is missing"),
    (
        'fibre = "cotton"',
        'packing = 0.6\nyarn_density = "0.9 g/cm3"',
        "warp.yarn_density",
        "already holds",
    ),
    ('fibre = "cotton"', "flattening = 0.3", "warp.flattening", "from 1 to 5"),
    ('fibre = "cotton"', 'flattening = "flat"', "warp.flattening", "1.4"),
    ('crimp = "6 %"', "crimp = 6", "warp.crimp", "write the number with its unit"),
    ('crimp = "6 %"', 'crimp = "-6 %"', "warp.crimp", "0 to 50 %"),
    ('crimp = "6 %"', 'size = "60 %"', "warp.size", "0 to 40 %"),
    ("[weft]", '[weft]\nsize = "8 %"', "weft.size", "belongs in [warp]"),
    ('weave = "plain"', 'weave = "2/2 twil"', "article.weave", "2/2 twill"),
    ('weave = "plain"', "weave = 3", "article.weave", "expected text"),
    ('state = "finished"', 'state = "gray"', "article.state", '"grey" or "finished"'),
    ('code = "VELA-7"', 'code = " "', "article.code", "got nothing"),
    ('code = "VELA-7"', 'code = "\\u001b[31m"', "article.code", "control"),
    ('code = "VELA-7"', '"c\\u001bde" = "A"', "article.'c\\x1bde'", "unknown key"),
    ("[tolerance]", "[tolerence]", "tolerence", '"tolerance"'),
    ("[tolerance]", "[tolerance]\nwidth = 1", "tolerance.width", "ends, picks, cover, mass"),
    ('cover = "4 points"', 'cover = "4 %"', "tolerance.cover", "points"),
    ('ends = "2 %"', 'ends = "2"', "tolerance.ends", "unit is missing"),
    ('ends = "2 %"', 'ends = ""', "tolerance.ends", "2 %"),
    ("declared = 0.66", "declared = 66", "cover.declared", "0 to 1"),
    ("declared = 0.66", "declared = nan", "cover.declared", "figure such as"),
    ("declared = 0.66", "declared = true", "cover.declared", "true or false"),
    ('"99 g/m2"', '"99 g"', "mass.declared", "g/m2"),
    ('"99 g/m2"', '"99000 g/m2"', "mass.declared", "5 to 3000"),
    ('"0.812 u 0.004"', "0.812", "reference.optical_cover", "uncertainty"),
    ('"0.812 u 0.004"', '"0.812 u 0"', "reference.optical_cover", "uncertainty"),
    ('"0.812 u 0.004"', "{ value = 0.8 }", "reference.optical_cover", "value and u"),
    ('"0.812 u 0.004"', '"0.812 u -0.1"', "reference.optical_cover", "zero or more"),
    ("[article]", 'crimp = "6 %"\n[article]', "crimp", "[warp] or [weft]"),
    ("[article]", "article = 3\n[articles]", "articles", '"article"'),
]


@pytest.mark.parametrize(("stands", "planted", "path", "words"), FAULTS)
def test_a_fault_is_named_by_path_with_what_was_expected(
    stands: str, planted: str, path: str, words: str
) -> None:
    assert stands in SHEET
    with pytest.raises(DeclarationError) as refusal:
        read(SHEET.replace(stands, planted, 1))
    assert refusal.value.where == f"vela.toml: {path}"
    assert words in f"{refusal.value.fault}. {refusal.value.remedy}"
    assert str(refusal.value).isprintable()


def test_a_missing_table_is_named() -> None:
    with pytest.raises(DeclarationError, match=r"weft: is missing.*add the table \[weft\]"):
        read(SHEET[: SHEET.index("[weft]")])


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"\xff\xfe\x00", "not UTF-8"),
        (b"[warp", "not valid TOML"),
        (b"a = " + b"[" * 5000, "not valid TOML"),
        (b"", "article: is missing"),
        (b"warp = 1\nweft = 1\narticle = 1", "table of keys"),
    ],
)
def test_what_is_no_declaration_is_refused(content: bytes, words: str) -> None:
    with pytest.raises(DeclarationError) as refusal:
        read_declaration(content)
    assert words in str(refusal.value)


def test_what_is_no_file_is_refused(tmp_path: Path) -> None:
    pipe, large = tmp_path / "pipe", tmp_path / "large.toml"
    os.mkfifo(pipe)
    large.write_bytes(b"#" * (LARGEST_FILE + 1))
    for path, words in [
        (tmp_path / "absent.toml", "No such file"),
        (tmp_path, "not a file"),
        (pipe, "not a file"),
        (Path("/dev/zero"), "not a file"),
        (large, "too large"),
        (tmp_path / "a\0b", "cannot be read"),
    ]:
        with pytest.raises(DeclarationError) as refusal:
            read_declaration(path)
        assert words in str(refusal.value)


@pytest.mark.parametrize("source", ["scan 7, sheet 2", 'quoted "so" \\ and so', "Gewebe ß 布"])
@pytest.mark.parametrize("u", [0.0041234567, 1e-9])
def test_an_approved_swatch_is_written_as_it_is_read(source: str, u: float) -> None:
    table = reference_table(
        optical_cover=Measured(0.81234567, u, "1"),
        warp_cover=None,
        weft_cover=Measured(0.4, 0.01, "1"),
        source=source,
    )
    sheet = read(SHEET[: SHEET.index("[reference]")] + table)
    assert sheet.reference.source == source
    assert sheet.reference.optical_cover is not None
    assert sheet.reference.optical_cover.value == pytest.approx(0.81234567, abs=5e-7)
    assert sheet.reference.optical_cover.u == pytest.approx(u, abs=1e-6)
    assert sheet.reference.weft_cover == Measured(0.4, 0.01, "1")


VALID = {
    "threads": ["68 /in", "250 /cm", "5 /10cm", "18.5 /cm"],
    "count": ["1 Ne", "300 Ne", "2/40 Ne", "167 dtex f 48 x 2", "22 dtex f 1", "R 60 tex/2"],
    "fibre": ["cotton", "glass", "wool 20 %, nylon 80 %", "linen"],
    "spinning": ["rotor", "monofilament", "textured"],
    "crimp": ["0 %", "50 %", "6 % u 3 %"],
    "packing": ["0.1 u 0.03", "1", "0.62"],
    "yarn_density": ["0.05 g/cm3", "8 g/cm3", "900 kg/m3 u 200"],
    "flattening": ["round", "1.0", "5 u 1.6", "race-track 1.4 u 0.4"],
    "weave": ["8-end satin", "2/2 hopsack", "3/1 twill", "2/2 herringbone", "2/2 weft rib"],
    "state": ["grey", "finished"],
    "finish_change": ["-50 %", "200 %"],
}
ARTICLE = ("weave", "state")


def lines(keys: list[str]) -> st.SearchStrategy[list[str]]:
    """A few lines, no key twice, nearly always with a value that is in bounds."""
    odd = st.tuples(st.sampled_from(sorted(VALID)), st.text(max_size=12))
    valid = st.sampled_from([(key, value) for key in keys for value in VALID[key]])
    pairs = st.lists(valid, max_size=4, unique_by=lambda pair: pair[0])
    spoiled = st.lists(odd, max_size=1)
    return st.tuples(pairs, st.one_of(st.just([]), st.just([]), spoiled)).map(
        lambda both: [f"{key} = {json.dumps(value)}" for part in both for key, value in part]
    )


YARN = lines([key for key in VALID if key not in (*ARTICLE, "finish_change")])


@settings(max_examples=150, deadline=None)
@given(YARN, YARN, lines(list(ARTICLE)))
def test_any_sheet_is_read_and_predicted_or_refused(
    warp: list[str], weft: list[str], article: list[str]
) -> None:
    """Nothing but a DeclarationError ever leaves the reader, and what it lets in is predicted."""
    own = {"article": 'code = "A"\n', "warp": "", "weft": ""}
    text = ""
    for table, written in (("article", article), ("warp", warp), ("weft", weft)):
        keys = {line.split(" = ")[0] for line in written}
        least = ['threads = "20 /cm"', 'count = "30 tex"'] if table != "article" else []
        kept = [line for line in least if line.split(" = ")[0] not in keys]
        text += "\n".join([f"[{table}]", own[table], *kept, *written, ""])
    try:
        sheet = read(text)
    except DeclarationError as refusal:
        assert str(refusal).isprintable()
        return
    seen = predict(sheet)
    assert 0 <= seen.cover.value <= 1
    assert seen.mass.value > 0
    named = {}
    for constant in seen.construction.constants:
        # one name is one constant: a second value under it would be shifted with the first
        assert named.setdefault(constant.name, constant.value) == constant.value
