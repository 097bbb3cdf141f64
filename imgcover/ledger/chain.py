"""How a ledger shows that nothing in it was changed: every row is sealed to the one before.

A row's seal is the SHA-256 of eight lines of text, each ended by a newline: the seal before (64
zeros for row 1), the row's number, the schema, the key, the number of the row it supersedes (0 for
none), and the SHA-256 of the subject, of the body and of the evidence as stored (of their UTF-8
bytes). Anyone with a hash tool can follow it. The time of a row is not sealed: the same
measurements give the same seals on every machine and every day.
"""

from __future__ import annotations

import hashlib
import re
from dataclasses import dataclass

from imgcover.errors import OptionError

SEAL_DIGITS = 64
"""Hexadecimal digits of a SHA-256."""
FEWEST_SEAL_DIGITS = 20
"""A head may be typed from paper by its first digits; 80 bits still cannot be met by trying."""


@dataclass(frozen=True, slots=True)
class Head:
    """Where a ledger stands: the number and the seal of its last row.

    Parameters
    ----------
    n : int
        Rows so far; 0 for an empty ledger.
    seal : str
        Hexadecimal digits of the last row's seal; a typed head may hold only the first of them.
    """

    n: int
    seal: str

    @classmethod
    def parse(cls, text: str) -> Head:
        """Read a head as a report prints it, spaces and case allowed.

        Raises
        ------
        OptionError
            When it is not a number, a colon and at least 20 hexadecimal digits.

        Examples
        --------
        >>> Head.parse("12: 9F3A 0b11 22cc 44dd 55ee").n
        12
        """
        bare = re.sub(r"\s", "", text).lower()
        match = re.fullmatch(rf"(\d+):([0-9a-f]{{{FEWEST_SEAL_DIGITS},{SEAL_DIGITS}}})", bare)
        if match is None:
            raise OptionError(
                "--head",
                f"expected NUMBER:SEAL with at least {FEWEST_SEAL_DIGITS} digits, got {text!r}",
                "copy the head from the foot of a report",
            )
        return cls(int(match[1]), match[2])

    def __str__(self) -> str:
        return f"{self.n}:{self.seal}"


EMPTY = Head(0, "0" * SEAL_DIGITS)
"""The head of a ledger without rows."""


@dataclass(frozen=True, slots=True)
class Entry:
    """What is to be remembered.

    Parameters
    ----------
    schema : str
        Of the body: "imgcover/record/1" or "imgcover/lot/1".
    subject : str
        What the body is about; a later entry about the same subject supersedes this one.
    key : str
        Hash of everything that could have changed a digit or a decision of the body.
    body : str
        JSON text without its envelope, kept to the byte.
    made_at : str
        UTC, from the envelope; not sealed.
    evidence : str
        What a lot's verdict takes from a picture, as JSON; empty where there is none.
    """

    schema: str
    subject: str
    key: str
    body: str
    made_at: str
    evidence: str = ""


@dataclass(frozen=True, slots=True)
class Row:
    """An entry in its place in the ledger.

    Parameters
    ----------
    n : int
        1 for the first.
    entry : Entry
        What is remembered.
    supersedes : int or None
        The row that spoke about this subject until now.
    previous, seal : str
        The seals of the row before and of this one.
    """

    n: int
    entry: Entry
    supersedes: int | None
    previous: str
    seal: str

    @property
    def head(self) -> Head:
        """Where the ledger stood when this row was its last."""
        return Head(self.n, self.seal)


def sealed(entry: Entry, *, after: Head, supersedes: int | None) -> Row:
    """Put an entry behind a head.

    Examples
    --------
    >>> entry = Entry("imgcover/record/1", "a", "k", "{}", "2031-01-01T00:00:00Z")
    >>> row = sealed(entry, after=EMPTY, supersedes=None)
    >>> row.n, row.previous == EMPTY.seal, len(row.seal)
    (1, True, 64)
    """
    n = after.n + 1
    lines = (after.seal, str(n), entry.schema, entry.key, str(supersedes or 0))
    hashed = (_digest(entry.subject), _digest(entry.body), _digest(entry.evidence))
    text = "".join(f"{line}\n" for line in (*lines, *hashed))
    return Row(n, entry, supersedes, after.seal, _digest(text))


def _digest(text: str) -> str:
    return hashlib.sha256(text.encode()).hexdigest()


__all__ = ["EMPTY", "Entry", "Head", "Row", "sealed"]
