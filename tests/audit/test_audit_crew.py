"""Truth is arithmetic and the system's: real processes are killed, hang and run out."""

import os
import time

import crew_work
import pytest

from imgcover.audit.crew import LocalCrew
from imgcover.audit.outcome import Done, Loss, Lost


def test_every_load_is_done_once():
    with LocalCrew(hands=2, limit_s=60) as crew:
        answers = list(crew.run(crew_work.double, enumerate(range(50))))
    assert sorted((done.index, done.answer) for done in answers) == [(n, 2 * n) for n in range(50)]


def test_answers_come_as_they_are_done():
    with LocalCrew(hands=2, limit_s=60) as crew:
        list(crew.run(crew_work.double, enumerate(range(2))))  # both are up
        loads = [(0, (0, 1.5)), (1, (1, 0.0)), (2, (2, 0.0))]
        assert [done.index for done in crew.run(crew_work.slow, loads)] == [1, 2, 0]


def test_loads_are_drawn_only_as_workers_fall_idle():
    drawn = []

    def loads():
        for n in range(20):
            drawn.append(n)
            yield n, n

    with LocalCrew(hands=2, limit_s=60) as crew:
        for heard, _ in enumerate(crew.run(crew_work.double, loads()), start=1):
            # two underway, and one that was done at the same moment as this and is told next
            assert len(drawn) <= heard + 3


def test_a_process_has_one_thread_and_this_one_keeps_its_own(monkeypatch):
    monkeypatch.setenv("OPENBLAS_NUM_THREADS", "7")
    with LocalCrew(hands=1, limit_s=60) as crew:
        assert next(crew.run(crew_work.threads, [(0, 0)])) == Done(0, "1")
    assert os.environ["OPENBLAS_NUM_THREADS"] == "7"


def test_the_lost_cost_only_themselves_and_are_tried_again_alone(tmp_path):
    what = ["", "die", "", "die once", "raise", "hang", "leave", "no memory", ""]
    loads = [(n, (n, each, str(tmp_path))) for n, each in enumerate(what)]
    with LocalCrew(hands=2, limit_s=1.5) as crew:
        list(crew.run(crew_work.double, enumerate(range(2))))
        outcomes = {each.index: each for each in crew.run(crew_work.stumble, loads)}
    assert len(outcomes) == len(what)
    for n in (0, 2, 3, 8):
        assert outcomes[n] == Done(n, n)
    lost = {n: each.loss for n, each in outcomes.items() if isinstance(each, Lost)}
    assert lost == {
        **{1: Loss.DIED, 4: Loss.FAULT, 5: Loss.HUNG},
        **{6: Loss.FAULT, 7: Loss.DIED},
    }
    assert "SIGKILL" in outcomes[1].said
    assert "planted" in outcomes[4].said
    tries = {n: len(list(tmp_path.glob(f"{n}-*"))) for n in range(len(what))}
    # a bug is the same the second time; a death or a hang may have had its cause outside
    assert tries == {0: 1, 1: 2, 2: 1, 3: 2, 4: 1, 5: 2, 6: 1, 7: 2, 8: 1}


def test_what_cannot_be_loaded_is_a_fault():
    with LocalCrew(hands=1, limit_s=60) as crew:
        (lost,) = crew.run(crew_work.double, [(0, crew_work.broken_order())])
    assert lost.loss is Loss.FAULT
    assert "no_such_library" in lost.said


def test_loading_the_program_takes_no_time_from_the_first_picture():
    # its module sleeps for two seconds when it is loaded
    import slow_to_load

    with LocalCrew(hands=1, limit_s=1.0) as crew:
        assert list(crew.run(slow_to_load.double, [(0, 4)])) == [Done(0, 8)]


def test_a_program_that_cannot_be_loaded_is_not_blamed_on_pictures(tmp_path, monkeypatch):
    (tmp_path / "goes_away.py").write_text("def work(n):\n    return n\n")
    monkeypatch.syspath_prepend(str(tmp_path))
    import goes_away

    (tmp_path / "goes_away.py").write_text("import no_such_library\n")
    crew = LocalCrew(hands=2, limit_s=30)
    with pytest.raises(RuntimeError, match="no_such_library"), crew:
        list(crew.run(goes_away.work, enumerate(range(4))))


def alive(pid: int) -> bool:
    try:
        os.kill(pid, 0)
    except ProcessLookupError:
        return False
    return True


def test_nothing_runs_on_when_it_is_left_in_the_middle():
    with pytest.raises(KeyboardInterrupt), LocalCrew(hands=2, limit_s=60) as crew:
        pids = {done.answer for done in crew.run(crew_work.pid, enumerate(range(6)))}
        begun = time.monotonic()
        for _ in crew.run(crew_work.slow, [(0, (0, 0.0)), (1, (1, 300.0)), (2, (2, 300.0))]):
            raise KeyboardInterrupt
    assert time.monotonic() - begun < 5
    assert not any(alive(each) for each in pids)


def test_the_workers_stay_for_the_next_round():
    with LocalCrew(hands=1, limit_s=60) as crew:
        rounds = [{d.answer for d in crew.run(crew_work.pid, enumerate(range(3)))} for _ in "ab"]
    assert rounds[0] == rounds[1]
    assert not any(alive(each) for each in rounds[0])


@pytest.mark.parametrize(("hands", "limit_s"), [(0, 1.0), (1, 0.0)])
def test_a_crew_of_nobody_and_no_time_is_refused(hands, limit_s):
    with pytest.raises(ValueError, match="must be"):
        LocalCrew(hands=hands, limit_s=limit_s)
