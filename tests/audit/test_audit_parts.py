"""Truth is symmetry (what is written reads back) and clocks and machines that the test makes up."""

import os
import time

import pytest
from hypothesis import given
from hypothesis import strategies as st

from imgcover.audit import machine
from imgcover.audit.digests import Digests
from imgcover.audit.evidence import evidence_text, observed_from
from imgcover.audit.folder import list_folder
from imgcover.audit.lots import Member, place_numbers, sum_lot
from imgcover.audit.out_folder import OutFolder, page_name
from imgcover.audit.settling import Settling, signature
from imgcover.cli.progress import Progress
from imgcover.errors import OutputError
from imgcover.findings import Flag
from imgcover.quantity import Measured
from imgcover.verdict.observed import Observed, Spread

NUMBERS = st.floats(allow_nan=False, allow_infinity=False)
SIZES = st.floats(min_value=0, max_value=1e300)
MEASURED = st.none() | st.builds(Measured, NUMBERS, SIZES, st.sampled_from(["1/cm", "1"]))
SEEN = st.builds(
    Observed,
    ends=MEASURED,
    cover=MEASURED,
    ends_spread=st.builds(Spread, SIZES, st.integers(0, 99)),
    scale_u=SIZES,
    ends_length_mm=st.none() | SIZES,
    repeat=st.none() | st.tuples(st.integers(1, 9), st.integers(1, 9)),
    picks_forks=st.lists(SIZES, max_size=3).map(tuple),
    flags=st.frozensets(st.sampled_from(list(Flag)), max_size=4),
    conditioned=st.booleans(),
    place=st.text(),
)


@given(SEEN)
def test_evidence_reads_back_whole(seen):
    assert observed_from(evidence_text(seen)) == seen


def test_what_is_no_evidence_is_refused():
    assert observed_from("") == Observed()
    for text in ("[]", '{"ends": {"unit": "1"}}', '{"colour": 1}', '{"flags": ["NO_FLAG"]}'):
        with pytest.raises(ValueError, match=r"."):
            observed_from(text)


def seen(place: str, ends: float) -> Observed:
    return Observed(ends=Measured(ends, 0.05, "1/cm"), place=place)


def test_pictures_are_summed_by_place_and_copies_once():
    members = [
        Member("a", "p1", seen("1", 25.0)),
        Member("b", "p2", seen("2", 26.0)),
        Member("c", "p1", seen("3", 25.0)),
        Member("d", "p3", seen("2", 26.0)),
        Member("e", None, Observed(place="")),
        Member("f", None, Observed(place="")),
    ]
    summed = sum_lot(members, lot="7", declaration=None, risk=None)
    assert place_numbers(members) == (1, 2, None, 2, 3, 4)
    assert summed["n_places"] == 2
    # two places, 25 and 26: their mean, whatever the number of pictures of each
    assert summed["means"]["ends"]["value"] == pytest.approx(25.5)
    assert summed["decision"] is None
    said = [each["message"] for each in summed["findings"]]
    assert "c shows the same pixels as a; counted once" in said


def test_jobs_follow_cores_and_memory(tmp_path, monkeypatch):
    monkeypatch.setattr(machine, "MEMINFO", tmp_path / "meminfo")
    monkeypatch.setattr(machine, "CGROUP", tmp_path)
    monkeypatch.setattr(os, "sched_getaffinity", lambda _: set(range(16)), raising=False)
    assert machine.jobs_that_fit() == 16
    (tmp_path / "meminfo").write_text("MemTotal: 9 kB\nMemAvailable:   7812500 kB\n")
    assert machine.jobs_that_fit() == 8
    (tmp_path / "memory.max").write_text("3500000000\n")
    (tmp_path / "memory.current").write_text("500000000\n")
    assert machine.jobs_that_fit() == 3
    (tmp_path / "cpu.max").write_text("200000 100000\n")
    assert machine.jobs_that_fit() == 2
    (tmp_path / "memory.current").write_text("3400000000\n")
    assert machine.jobs_that_fit() == 1


def test_a_file_that_grows_is_waited_for(tmp_path, monkeypatch):
    now = [100.0]
    still = Settling(clock=lambda: now[0])
    path = tmp_path / "a.png"
    assert not still.is_whole(path)
    path.write_bytes(b"1")
    assert not still.is_whole(path)
    now[0] += 1.5
    path.write_bytes(b"12")
    assert not still.is_whole(path)
    now[0] += 1.9
    assert not still.is_whole(path)
    now[0] += 0.2
    assert still.is_whole(path)
    path.write_bytes(b"123")
    assert not still.is_whole(path)


def test_a_file_that_lay_there_before_is_whole_at_once(tmp_path):
    path = tmp_path / "a.png"
    path.write_bytes(b"1")
    os.utime(path, (time.time() - 60, time.time() - 60))
    assert Settling().is_whole(path)
    assert Settling().is_whole(None)


def test_a_round_rests_on_pictures_sheet_and_articles(tmp_path):
    (tmp_path / "A").mkdir()
    (tmp_path / "A" / "1.png").write_bytes(b"1")
    (tmp_path / "A" / "article.toml").write_bytes(b"1")

    def now():
        return signature(list_folder(tmp_path, articles=None), [tmp_path / "lots.csv"])

    seen_ = [now(), now()]
    assert seen_[0] == seen_[1]
    for name in ("A/1.png", "A/article.toml", "A/2.png"):
        (tmp_path / name).write_bytes(b"changed")
        assert now() != seen_[-1]
        seen_.append(now())


def test_hashes_are_remembered_until_a_file_is_touched(tmp_path, monkeypatch):
    path = tmp_path / "a.png"
    path.write_bytes(b"1")
    digests = Digests()
    first = digests.of(path)
    monkeypatch.setattr("imgcover.audit.digests.SETTLED_NS", -1)
    digests.of(path)
    monkeypatch.setattr("imgcover.audit.digests.read_file", lambda _: pytest.fail("read again"))
    assert digests.of(path) == first
    monkeypatch.undo()
    path.write_bytes(b"22")
    assert digests.of(path) != first


def test_a_file_just_written_is_read_again(tmp_path):
    # the same size within one tick of the clock: only reading shows the change
    path = tmp_path / "a.png"
    path.write_bytes(b"1")
    digests = Digests()
    first, trace = digests.of(path), path.stat()
    path.write_bytes(b"2")
    os.utime(path, ns=(trace.st_atime_ns, trace.st_mtime_ns))
    assert digests.of(path) != first


def test_a_file_appears_whole_or_not_at_all(tmp_path):
    out = OutFolder(tmp_path / "out")
    out.write("a.txt", "one")
    with pytest.raises(RuntimeError), out.opened("a.txt") as file:
        file.write(b"tw")
        raise RuntimeError
    assert (tmp_path / "out" / "a.txt").read_text() == "one"
    assert not list((tmp_path / "out").glob(".*.part"))


def test_an_out_folder_that_cannot_be_is_told(tmp_path):
    (tmp_path / "file").write_bytes(b"")
    with pytest.raises(OutputError, match="cannot be written"):
        OutFolder(tmp_path / "file" / "out")


def test_pages_have_names_of_their_own():
    taken = {page_name("A-1", "x").lower()}
    names = [
        page_name("A-1", "x"),
        page_name("a-1", "x", taken=taken),
        page_name("A-1", "y", taken=taken),
        page_name("A 1", "x"),
        page_name("../../A-1", "x"),
        page_name("aux", "x"),
        page_name("", "x"),
        page_name("\u202e" * 300, "x"),
    ]
    assert len({name.lower() for name in names}) == len(names)
    assert all(name.startswith("lots/") and ".." not in name and len(name) < 70 for name in names)


def test_progress_tells_how_long_the_rest_takes():
    now = [0.0]
    progress = Progress(100, clock=lambda: now[0])
    for _ in range(50):
        progress.step(measured=False)
    now[0] = 20.0
    for _ in range(10):
        progress.step(measured=True)
    # ten took 20 s, forty are left; the known ones took nothing
    assert progress.line(20.0) == "60 of 100 pictures, about 80 s left"
