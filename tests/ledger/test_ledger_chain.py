"""Truth is arithmetic: seals followed with hashlib alone, as the format's description says."""

import hashlib

import pytest

from imgcover.errors import OptionError
from imgcover.ledger.chain import EMPTY, Entry, Head, sealed
from imgcover.ledger.verify import verify

DAY = "2031-04-02T06:00:00Z"


def entry(subject: str, body: str = "{}") -> Entry:
    return Entry("imgcover/record/1", subject, "k1", body, DAY)


def chain(*entries: Entry):
    head, said = EMPTY, {}
    for each in entries:
        row = sealed(each, after=head, supersedes=said.get(each.subject))
        head, said[each.subject] = row.head, row.n
        yield row


def test_a_seal_is_the_digest_of_the_eight_lines_that_are_described():
    first, second = chain(entry("a"), entry("a", '{"é": 1}'))
    lines = [first.seal, "2", "imgcover/record/1", "k1", "1"]
    lines += [hashlib.sha256(text.encode()).hexdigest() for text in ("a", '{"é": 1}', "")]
    by_hand = hashlib.sha256("".join(f"{line}\n" for line in lines).encode()).hexdigest()
    assert second.seal == by_hand


def test_the_time_is_not_sealed():
    late = Entry("imgcover/record/1", "a", "k1", "{}", "2032-01-01T00:00:00Z")
    assert next(chain(entry("a"))).seal == next(chain(late)).seal


def test_an_untouched_chain_holds_and_says_that_completeness_is_not_shown():
    rows = list(chain(entry("a"), entry("b"), entry("a", "{ }")))
    seen = verify(rows, head=None)
    assert seen.holds
    assert "completeness is not shown" in seen.completeness
    assert seen.head == rows[-1].head


def test_a_head_shows_completeness_and_allows_growth():
    rows = list(chain(entry("a"), entry("b"), entry("c")))
    seen = verify(rows, head=rows[1].head)
    assert seen.holds
    assert seen.completeness == "complete up to row 2, as the head says; 1 added since"


def test_the_first_digits_of_a_head_are_enough():
    rows = list(chain(entry("a"), entry("b")))
    typed = Head.parse(f"2: {rows[1].seal[:24].upper()}")
    assert verify(rows, head=typed).holds


def test_a_changed_row_shows():
    rows = list(chain(entry("a"), entry("b"), entry("c")))
    bent = sealed(entry("b", '{"ends": 27}'), after=rows[0].head, supersedes=None)
    kept = [rows[0], type(bent)(2, bent.entry, None, rows[1].previous, rows[1].seal), rows[2]]
    assert verify(kept, head=None).faults == ("row 2 was changed",)


def test_a_removed_row_shows():
    rows = list(chain(entry("a"), entry("b"), entry("c")))
    assert "row 2 was removed" in verify([rows[0], rows[2]], head=None).faults
    assert "row 1 was removed" in verify(rows[1:], head=None).faults


def test_rows_cut_off_at_the_end_show_only_with_a_head():
    rows = list(chain(entry("a"), entry("b"), entry("c")))
    assert verify(rows[:2], head=None).holds
    cut = verify(rows[:2], head=rows[2].head)
    assert cut.faults == ("rows after 2 were cut off: the head names row 3",)


def test_a_ledger_written_anew_shows_only_with_a_head():
    rows = list(chain(entry("a"), entry("b")))
    anew = list(chain(entry("a"), entry("b", '{"ends": 27}')))
    assert verify(anew, head=None).holds
    assert not verify(anew, head=rows[1].head).holds


def test_a_row_that_hides_what_it_supersedes_shows():
    first = next(chain(entry("a")))
    hiding = sealed(entry("a", "{ }"), after=first.head, supersedes=None)
    assert verify([first, hiding], head=None).faults == (
        "row 2 supersedes row None, but row 1 spoke last",
    )


def test_an_empty_ledger_has_an_empty_head():
    assert verify([], head=EMPTY).holds
    assert verify([], head=None).head == EMPTY


def test_many_faults_are_counted_not_listed():
    rows = list(chain(*(entry(str(n)) for n in range(60))))
    odd = verify(rows[::2], head=None).faults
    assert len(odd) == 21
    assert odd[-1] == "and 9 more"


@pytest.mark.parametrize(
    "text", ["", "3", "3:abc", "x:" + "a" * 64, "3:" + "g" * 64, "3;" + "a" * 64]
)
def test_what_is_no_head_is_refused(text):
    with pytest.raises(OptionError, match="foot of a report"):
        Head.parse(text)
