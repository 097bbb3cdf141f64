"""Audits that are killed: `python tests/audit/kill_driver.py FOLDER OUT KILLS SEED [--measure]`.

Starts an audit of FOLDER again and again, kills it (SIGKILL) after a random while, and at last lets
one run to its end. Without --measure pictures are only hashed and waited for, so that kills fall
on every part of the bookkeeping; with it they are measured as always.
"""

from __future__ import annotations

import argparse
import hashlib
import json
import os
import random
import signal
import sys
import time
from pathlib import Path

from imgcover.audit.crew import LocalCrew
from imgcover.audit.digests import Digests
from imgcover.audit.folder import list_folder
from imgcover.audit.grounds import Grounds, read_file
from imgcover.audit.orders import Order, OrderBook
from imgcover.audit.out_folder import OutFolder
from imgcover.audit.run import Round, measure_all
from imgcover.audit.telling import sum_lots
from imgcover.audit.work import Answer, measure_one
from imgcover.ledger.store import Ledger

LONGEST_S = 0.9
"""A kill comes at most this long after the audit began: about when all pictures are done."""
ONE_FAULTS = 7
"""Every so many pictures take longer than those after them, so that some finish out of turn."""


def hashed(order: Order) -> Answer:
    """Stand in for measuring: the same answer for the same picture, after a while."""
    content = read_file(order.path)
    digest = hashlib.sha256(content).hexdigest()
    time.sleep(0.08 if int(digest[:8], 16) % ONE_FAULTS == 0 else 0.004)
    body = {
        "picture": {"name": order.name, "sha256": digest, "pixels_sha256": digest},
        "sample": {"piece": None, "place": order.sample.place},
    }
    return Answer(
        body=json.dumps(body), made_at=str(time.time()), evidence="", picture_sha256=digest
    )


def audit(folder: Path, out: OutFolder, *, measure: bool) -> None:
    """Go through the folder once."""
    with Ledger.open(out.ledger) as ledger, LocalCrew(hands=2, limit_s=60) as crew:
        round_ = Round(
            listing=list_folder(folder, articles=None),
            book=OrderBook(Grounds.of([folder]), defaults={}, versions={"imgcover": "test"}),
            folder=folder.name,
            ledger=ledger,
            out=out,
            digests=Digests(),
        )
        for _ in measure_all(round_, crew, work=measure_one if measure else hashed):
            pass
        for _ in sum_lots(round_, risk=None):
            pass


def main() -> int:
    """Kill, then finish."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("folder", type=Path)
    parser.add_argument("out", type=Path)
    parser.add_argument("kills", type=int)
    parser.add_argument("seed", type=int)
    parser.add_argument("--measure", action="store_true")
    parser.add_argument("--longest", type=float, default=LONGEST_S)
    asked = parser.parse_args()
    chance, out = random.Random(asked.seed), OutFolder(asked.out)
    in_the_middle = 0
    for _ in range(asked.kills):
        # a fork has everything imported: nearly all of the time before the kill is audit
        child = os.fork()
        if child == 0:
            audit(asked.folder, out, measure=asked.measure)
            os._exit(0)
        time.sleep(chance.uniform(0, asked.longest))
        os.kill(child, signal.SIGKILL)
        in_the_middle += os.WIFSIGNALED(os.waitpid(child, 0)[1])
    audit(asked.folder, out, measure=asked.measure)
    sys.stdout.write(f"{in_the_middle}\n")
    return 0


if __name__ == "__main__":
    sys.exit(main())
