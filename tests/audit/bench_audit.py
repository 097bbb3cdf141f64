"""How an audit holds up: speed, memory, kills and hostile files, at full size.

    python tests/audit/bench_audit.py speed     2,000 small pictures with one process and with two
    python tests/audit/bench_audit.py kills     50 kills of an audit that measures, then compared
    python tests/audit/bench_audit.py hostile   1,000 damaged and hostile files

Each prints a table and leaves with 1 where a bound is not kept. Needs an idle machine of two cores
and Linux; `--count` makes it smaller. Smaller fixed cases of the same run in the tests.
"""

from __future__ import annotations

import argparse
import os
import resource
import sqlite3
import subprocess
import sys
import tempfile
import threading
import time
from pathlib import Path

from audit_rig import ROOT, command, lay, records
from hostile import lay_hostile

from imgcover.audit.folder import list_folder
from imgcover.audit.grounds import Grounds
from imgcover.audit.orders import OrderBook
from imgcover.audit.work import measure_one

PLACES = 5
"""Pictures a lot, as the standard asks for."""
FASTER = 1.8
OVERHEAD = 0.10
FLAT = 1.10
"""Peak memory with all pictures over peak with a tenth of them, start and reports included."""
SLOWEST_S = 5.0


def say(line: str) -> None:
    sys.stdout.write(line + "\n")
    sys.stdout.flush()


def run(folder: Path, out: Path, *options: str) -> tuple[float, float, float]:
    """Audit; seconds in all, seconds until the last picture, peak memory of the parent in MB."""
    begun = time.monotonic()
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    with subprocess.Popen(
        command(folder, out, *options),
        stdout=subprocess.DEVNULL,
        stderr=subprocess.PIPE,
        text=True,
        env=environment,
    ) as process:
        threading.Thread(target=lambda: list(process.stderr), daemon=True).start()
        peak, measured = 0.0, 0.0
        while process.poll() is None:
            peak = max(peak, _memory_mb(process.pid))
            if not measured and (out / "records.jsonl").exists():
                measured = time.monotonic() - begun
            time.sleep(0.05)
    return time.monotonic() - begun, measured, peak


def cpu_s() -> float:
    """Processor seconds of everything that was started from here and has ended."""
    used = resource.getrusage(resource.RUSAGE_CHILDREN)
    return used.ru_utime + used.ru_stime


def _memory_mb(pid: int) -> float:
    try:
        status = Path(f"/proc/{pid}/status").read_text()
    except OSError:
        return 0.0
    lines = [line for line in status.splitlines() if line.startswith("VmHWM:")]
    return int(lines[0].split()[1]) / 1024 if lines else 0.0


def measuring_s(folder: Path, count: int) -> float:
    """Seconds that measuring alone takes a picture, in one process without any audit."""
    os.environ.update(dict.fromkeys(("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS"), "1"))
    book = OrderBook(Grounds.of([folder]), defaults={}, versions={})
    listed = list_folder(folder, articles=None).pictures[: count + 1]
    measure_one(book.order(listed[0]))  # libraries are loaded
    begun = time.process_time()
    for each in listed[1:]:
        measure_one(book.order(each))
    # one process with one thread: where nothing else runs this is the time itself
    return (time.process_time() - begun) / max(1, len(listed) - 1)


def speed(folder: Path, count: int) -> bool:
    """One process against two; memory against a tenth of the pictures; overhead."""
    lots = {f"L{n:04}": PLACES for n in range(count // PLACES)}
    lay(folder / "goods", lots, side=240)
    lay(folder / "tenth", dict(list(lots.items())[: max(1, len(lots) // 10)]), side=240)
    alone = measuring_s(folder / "goods", 100)
    say(f"measuring alone          {1000 * alone:8.1f} ms a picture")
    _, _, peak_tenth = run(folder / "tenth", folder / "out-tenth", "--jobs", "2")
    before = cpu_s()
    one, _, peak_one = run(folder / "goods", folder / "out-one", "--jobs", "1")
    busy = (cpu_s() - before) / (count * alone) - 1
    two, measured, peak_two = run(folder / "goods", folder / "out-two", "--jobs", "2")
    say(f"one process, {count}       {one:8.1f} s, parent {peak_one:.0f} MB")
    say(f"two processes, {count}     {two:8.1f} s, parent {peak_two:.0f} MB")
    say(f"until the last picture   {measured:8.1f} s")
    faster, overhead = one / two, (one - count * alone) / (count * alone)
    say(f"processor beside measuring {100 * busy:6.1f} %")
    flat = peak_two / peak_tenth
    say(f"two over one             {faster:8.2f} ×  (at least {FASTER})")
    say(f"overhead, one process    {100 * overhead:8.1f} %  (at most {100 * OVERHEAD:.0f})")
    say(f"parent, all over a tenth {flat:8.2f} ×  (at most {FLAT}; a tenth: {peak_tenth:.0f} MB)")
    return faster >= FASTER and overhead <= OVERHEAD and flat <= FLAT


def kills(folder: Path, count: int) -> bool:
    """Kill an audit that measures, let it finish, and compare it with one nobody disturbed."""
    lay(folder / "goods", {f"L{n}": PLACES for n in range(8)}, side=240)
    driver = [sys.executable, str(Path(__file__).parent / "kill_driver.py")]
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    kept = {}
    for name, times in (("calm", 0), ("killed", count)):
        where = [str(folder / "goods"), str(folder / name), str(times), "5", "--measure"]
        done = subprocess.run(
            [*driver, *where, "--longest", "6"],
            env=environment,
            check=True,
            capture_output=True,
            text=True,
        )
        with sqlite3.connect(folder / name / "ledger.sqlite") as raw:
            query = "SELECT n, subject, key, body, evidence, seal FROM entry ORDER BY n"
            kept[name] = raw.execute(query).fetchall()
    say(f"{count} kills, {done.stdout.strip()} of them in the middle of an audit")
    same = kept["calm"] == kept["killed"]
    say(f"{len(kept['calm'])} rows, to the byte the same: {'yes' if same else 'NO'}")
    return same


def hostile(folder: Path, count: int) -> bool:
    """Audit damaged and hostile files; time each of them alone, too."""
    goods = folder / "goods" / "A"
    goods.mkdir(parents=True)
    laid = lay_hostile(goods, count=count, seed=11)
    book = OrderBook(Grounds.of([goods.parent]), defaults={"pitch": "24px/mm"}, versions={})
    slowest = (0.0, "")
    for each in list_folder(goods.parent, articles=None).pictures:
        begun = time.perf_counter()
        measure_one(book.order(each))
        slowest = max(slowest, (time.perf_counter() - begun, each.name))
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    say(f"slowest of {laid}          {slowest[0]:8.2f} s ({slowest[1]!r}), peak {peak:.0f} MB")
    took, _, _ = run(goods.parent, folder / "out", "--pitch", "24px/mm", "--time-limit", "30")
    told = [record for record in records(folder / "out") if "picture" in record]
    codes = [[each["code"] for each in record["findings"]] for record in told]
    bad = {"measuring-died", "measuring-took-too-long", "program-fault"}
    lost = [
        record["picture"]["name"] for record, c in zip(told, codes, strict=True) if bad & set(c)
    ]
    refused = sum(
        any(each["severity"] == "refusal" for each in record["findings"]) for record in told
    )
    say(f"audited in               {took:8.1f} s")
    say(f"records {len(told)} of {laid}; refused {refused}; lost {len(lost)} {lost[:5]}")
    return len(told) == laid and not lost and slowest[0] <= SLOWEST_S


BENCHES = {"speed": (speed, 2000), "kills": (kills, 50), "hostile": (hostile, 1000)}


def main() -> int:
    """Run one of them."""
    parser = argparse.ArgumentParser(description=__doc__.split("\n")[0])
    parser.add_argument("what", choices=sorted(BENCHES))
    parser.add_argument("--count", type=int)
    asked = parser.parse_args()
    bench, usual = BENCHES[asked.what]
    with tempfile.TemporaryDirectory() as place:
        kept = bench(Path(place), asked.count or usual)
    say("kept" if kept else "NOT KEPT")
    return 0 if kept else 1


if __name__ == "__main__":
    sys.exit(main())
