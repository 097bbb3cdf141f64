"""Truth is the order of what the test does to a watched folder."""

import os
import signal
import subprocess
import threading
import time

from audit_rig import ROOT, command, hearing_ctrl_c, lay, records


def test_pictures_are_measured_as_they_come_and_half_written_ones_waited_for(tmp_path):
    goods, out = tmp_path / "goods", tmp_path / "out"
    lay(goods, {"A": 2})
    late = (goods / "A-2.png").read_bytes()
    (goods / "A-2.png").unlink()
    with subprocess.Popen(
        command(goods, out, "--watch", "--jobs", "1"),
        stderr=subprocess.PIPE,
        stdout=subprocess.DEVNULL,
        text=True,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
        preexec_fn=hearing_ctrl_c,
    ) as process:
        said: list[str] = []
        listener = threading.Thread(target=lambda: said.extend(process.stderr))
        listener.start()
        try:
            heard(process, said, "not whole yet: 1 picture\n")
            assert [r["picture"]["name"] for r in pictures(out)] == ["A-1.png"]
            # as a scanner writes: a piece, a pause, the rest
            with (goods / "A-2.png").open("wb") as file:
                for n in range(4):
                    part = len(late) // 4 + 1
                    file.write(late[n * part : (n + 1) * part])
                    file.flush()
                    time.sleep(0.7)
            heard(process, said, "waiting for pictures\n")
        finally:
            process.send_signal(signal.SIGINT)
            process.wait(60)
            listener.join(60)
    assert process.returncode == 130
    told = pictures(out)
    assert [r["picture"]["name"] for r in told] == ["A-1.png", "A-2.png"]
    # never measured half: the first record of the late picture is of the whole one
    assert all(r["threads"] is not None for r in told)
    assert "2 pictures: 1 measured, 1 known from before" in "".join(said)


def heard(process: subprocess.Popen[str], said: list[str], words: str) -> None:
    until = time.monotonic() + 120
    while not any(words in line for line in said):
        assert process.poll() is None and time.monotonic() < until, said
        time.sleep(0.05)


def pictures(out):
    return [record for record in records(out) if "picture" in record]
