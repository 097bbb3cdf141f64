"""A ledger as text that can be read, kept and checked without this program."""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator

from imgcover.ledger.chain import Row


def exported(rows: Iterable[Row]) -> Iterator[str]:
    """Write each row as one line of JSON, chain included.

    Parameters
    ----------
    rows : iterable of Row
        In order.

    Yields
    ------
    str
        A line, ended. `body` and `evidence` are text, to the byte what was sealed
        (`imgcover.ledger.chain`).
    """
    for row in rows:
        entry = row.entry
        line = {
            "n": row.n,
            "schema": entry.schema,
            "subject": entry.subject,
            "key": entry.key,
            "supersedes": row.supersedes,
            "previous": row.previous,
            "seal": row.seal,
            "made_at": entry.made_at,
            "body": entry.body,
            "evidence": entry.evidence,
        }
        yield json.dumps(line) + "\n"


__all__ = ["exported"]
