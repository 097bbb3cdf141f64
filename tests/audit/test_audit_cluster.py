"""Truth is arithmetic and the system's: a real scheduler, two real workers, and their deaths."""

import time

import audit_rig
import cluster_rig
import crew_work
import pytest

from imgcover.audit.cluster import ClusterCrew, checked_address
from imgcover.audit.outcome import Done, Loss, Lost
from imgcover.errors import ClusterError


def version() -> str:
    return "the same"


def joined(rig, *, limit_s=60.0):
    return ClusterCrew(rig.address, limit_s=limit_s, certificates=cluster_rig.TLS, alike=version)


@pytest.fixture(scope="module")
def running(tmp_path_factory):
    with cluster_rig.rig(tmp_path_factory.mktemp("rig"), workers=2) as rig:
        yield rig


def test_every_load_is_done_once_and_tls_is_spoken(running):
    assert running.address.startswith("tls://")
    with joined(running) as crew:
        answers = list(crew.run(crew_work.double, enumerate(range(30))))
    assert sorted((done.index, done.answer) for done in answers) == [(n, 2 * n) for n in range(30)]


def test_a_bug_and_a_hang_cost_only_themselves(running, tmp_path):
    what = ["", "raise", "hang", "", "no memory"]
    loads = [(n, (n, each, str(tmp_path))) for n, each in enumerate(what)]
    with joined(running, limit_s=3.0) as crew:
        outcomes = {each.index: each for each in crew.run(crew_work.stumble, loads)}
    assert [outcomes[0], outcomes[3]] == [Done(0, 0), Done(3, 3)]
    lost = {n: each.loss for n, each in outcomes.items() if isinstance(each, Lost)}
    assert lost == {1: Loss.FAULT, 2: Loss.HUNG, 4: Loss.DIED}


def test_workers_with_other_versions_are_refused(running):
    with pytest.raises(ClusterError, match="other versions"):
        ClusterCrew(
            running.address, limit_s=9, certificates=cluster_rig.TLS, alike=crew_work.unlike
        )


def test_pictures_travel_as_bytes_or_by_path_and_records_are_the_same(running, tmp_path):
    goods = tmp_path / "goods"
    audit_rig.lay(goods, {"A": 2})
    audit_rig.audit_inline(goods, tmp_path / "here")
    for send in ("bytes", "path"):
        with joined(running) as crew:
            audit_rig.audit_inline(goods, tmp_path / send, crew=crew, send=send == "bytes")
        assert audit_rig.timeless(tmp_path / send) == audit_rig.timeless(tmp_path / "here")


def test_a_lost_worker_loses_nothing(running):
    with joined(running) as crew:
        while len(crew._client.nthreads()) < 2:
            time.sleep(0.05)
        answers = crew.run(crew_work.slow, ((n, (n, 0.1)) for n in range(30)))
        seen = [next(answers)]
        running.kill(running.workers[0])
        seen += list(answers)
    assert sorted(done.answer for done in seen) == list(range(30))


@pytest.mark.parametrize(
    ("address", "said"),
    [
        ("tcp://192.168.1.5:8786", "another machine"),
        ("mill.example:8786", "another machine"),
        ("127.0.0.1.example:8786", "another machine"),
        ("inproc://1.2.3.4/5/6", "no address"),
        ("tls://", "no address"),
        ("tcp://127.0.0.1:port", "no address"),
    ],
)
def test_an_address_in_the_open_is_refused(address, said):
    with pytest.raises(ClusterError, match=said):
        checked_address(address)


def test_tls_without_certificates_is_refused(tmp_path):
    for folder, said in ((None, "needs certificates"), (tmp_path, "no ca.pem")):
        with pytest.raises(ClusterError, match=said):
            ClusterCrew("tls://127.0.0.1:1", limit_s=1, certificates=folder, alike=version)
