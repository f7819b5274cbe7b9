"""Sweeps: one answer a row, the same whatever engine, portion or neighbour it had.

Kind: derived; every row is held against the answer of the path alone.
"""

import json
import os
import signal
import time
import tracemalloc
from dataclasses import replace
from datetime import UTC, datetime, timedelta

import numpy as np
import pytest

from magion.answers.bulk import Found, jobs_of, nearest_step
from magion.answers.engines import Cluster, Pool
from magion.answers.inputs import IonosphereInput
from magion.answers.path import answer_path
from magion.answers.sweep import SweepRow, in_this_process, sweep
from magion.errors import InputError
from magion.formats.contacts import BadRow, Contact
from magion.geometry import parse_place
from magion.render.sweep import cells

SKY = IonosphereInput(flux=120.0)
HUT = parse_place("46.50,11.35")
DAY = datetime(2026, 6, 21, tzinfo=UTC)


def contacts(count=14, seed=5):
    """Rows of three paths, two of them near and one of 1200 km, and a bad one."""
    generator = np.random.default_rng(seed)
    ends = [parse_place(p) for p in ("47.10,10.85", "45.80,12.90", "55.0,2.0")]
    rows = []
    for i in range(count):
        if i == 7:
            rows.append(BadRow(line=i + 2, reason="broken"))
            continue
        minute = int(generator.integers(9, 11)) * 60 + int(generator.integers(-25, 25))
        rows.append(
            Contact(
                line=i + 2,
                time=DAY + timedelta(minutes=minute),
                transmitter=ends[int(generator.integers(3))],
                receiver=HUT,
                frequency_mhz=float(generator.choice([5.3, 9.9])),
            )
        )
    return rows


@pytest.fixture(scope="module")
def swept():
    return list(sweep(contacts(), SKY))


def written(rows):
    return [("bad", r.line, r.reason) if isinstance(r, BadRow) else tuple(cells(r)) for r in rows]


def test_order_and_bad_rows_are_kept(swept):
    assert [getattr(r, "line", None) or r.contact.line for r in swept] == list(range(2, 16))
    assert [r.reason for r in swept if isinstance(r, BadRow)] == ["broken"]


def test_rows_agree_with_the_path_alone(swept):
    rows = [r for r in swept if isinstance(r, SweepRow)]
    for row in (rows[0], rows[5], rows[-1]):
        c = row.contact
        when = datetime.fromisoformat(row.answered_for_utc)
        assert abs(when - c.time) <= timedelta(minutes=30)
        alone = answer_path(c.transmitter, c.receiver, c.frequency_mhz, when, SKY)
        assert row.found.state == alone.advice.state
        assert row.found.wave == (alone.advice.wave and alone.advice.wave.value)
        if alone.advice.receive_hand:
            assert row.found.receive_hand == alone.advice.receive_hand.value
            assert row.found.transmit_hand == alone.advice.transmit_hand.value
        for muf, wave in zip(row.found.muf_mhz, alone.waves, strict=True):
            # The path's MUF is at least the frequency where a ray arrives; both are 0.3 % figures.
            assert muf == pytest.approx(wave.muf_mhz, rel=5e-3)


def test_portions_and_memory_change_nothing(swept):
    again = list(sweep(contacts(), SKY, portion=5))
    assert written(again) == written(swept)
    # Rays and MUFs are the same to the last bit, whatever shares their batch.
    for one, other in zip(swept, again, strict=True):
        if isinstance(one, SweepRow):
            assert one.found.level_db == other.found.level_db
            assert one.found.muf_mhz == other.found.muf_mhz


def test_a_pool_changes_nothing(swept):
    with Pool(2) as engine:
        assert written(sweep(contacts(), SKY, engine=engine)) == written(swept)


def test_a_cluster_that_loses_a_worker_changes_nothing(swept):
    distributed = pytest.importorskip("distributed")
    with distributed.LocalCluster(
        n_workers=3, threads_per_worker=1, processes=True, dashboard_address=None
    ) as cluster:
        pids = [w.pid for w in cluster.workers.values()]
        with Cluster(cluster.scheduler_address) as engine:
            stream = sweep(contacts(), SKY, engine=_killing(engine, pids[0]), portion=7)
            assert written(stream) == written(swept)
        # the worker that was ended is gone or replaced; its work was done by others
        assert pids[0] not in [w.pid for w in cluster.workers.values() if _alive(w.pid)]


def _alive(pid):
    try:
        os.kill(pid, 0)
    except OSError:
        return False
    return True


def _killing(engine, pid):
    """The engine, and one of its workers ended while it works."""

    def run(jobs, sky):
        import threading

        def end():
            time.sleep(1.0)
            if _alive(pid):
                os.kill(pid, signal.SIGKILL)

        threading.Thread(target=end, daemon=True).start()
        return engine(jobs, sky)

    return run


def test_a_cluster_that_is_not_there():
    pytest.importorskip("distributed")
    with pytest.raises(InputError, match="does not answer"):
        Cluster("tcp://127.0.0.1:9")


def test_a_path_that_cannot_be_answered_is_skipped_with_its_line():
    far = Contact(
        line=3, time=DAY, transmitter=parse_place("-46.5,-168.65"), receiver=HUT, frequency_mhz=9.0
    )
    too_long = replace(far, line=4, transmitter=parse_place("-34.0,151.0"))
    found = list(sweep([far, too_long], SKY))
    assert all(isinstance(r, BadRow) for r in found)
    assert [r.line for r in found] == [3, 4]


@pytest.mark.parametrize("known", [{"fof2_mhz": 5.0}, {"hmf2_km": 250.0}, {"foe_mhz": 2.0}])
def test_values_of_one_instant_are_refused(known):
    with pytest.raises(InputError, match="of one instant"):
        list(sweep([], IonosphereInput(**known)))


def test_nearest_step():
    noon = datetime(2026, 6, 21, 12, 0, tzinfo=UTC)
    assert nearest_step(noon + timedelta(minutes=29)) == ((2026, 6, 21), 720.0)
    assert nearest_step(noon + timedelta(minutes=30)) == ((2026, 6, 21), 780.0)
    assert nearest_step(datetime(2026, 12, 31, 23, 45, tzinfo=UTC)) == ((2027, 1, 1), 0.0)
    assert nearest_step(noon + timedelta(minutes=8), 15.0) == ((2026, 6, 21), 735.0)


def test_jobs_share_path_and_day():
    rows = [r for r in contacts() if isinstance(r, Contact)]
    asked = [(r.transmitter, r.receiver, r.time, r.frequency_mhz * 1e6) for r in rows]
    jobs, where = jobs_of(asked)
    assert len(jobs) == len({(r.transmitter.latitude_deg, r.time.date()) for r in rows})
    for row, (job, query) in zip(rows, where, strict=True):
        asked_of = jobs[job]
        assert asked_of.transmitter[0] == row.transmitter.latitude_deg
        assert asked_of.queries[query].frequency == row.frequency_mhz * 1e6


def _instant(jobs, sky):
    """An engine that answers at once, to weigh what lies around it."""
    for job in jobs:
        found = Found(
            distance_km=0.0, state="none", probability=None, wave=None, receive_hand=None,
            transmit_hand=None, level_db=(None, None), muf_mhz=(None, None), margin_mhz=None,
            here=None,
        )  # fmt: skip
        yield tuple(found for _ in job.queries)


def test_memory_does_not_grow_with_the_rows(monkeypatch):
    monkeypatch.setattr("magion.answers.sweep.REMEMBERED", 1000)

    def peak(count):
        one = contacts(2)[0]
        rows = (
            replace(one, line=i, frequency_mhz=1.0 + (i % 9_000) / 1e3, time=DAY)
            for i in range(count)
        )
        tracemalloc.start()
        for _ in sweep(rows, SKY, engine=_instant, portion=500):
            pass
        most = tracemalloc.get_traced_memory()[1]
        tracemalloc.stop()
        return most

    # 9,000 different queries, of which 1,000 are remembered; eight times the rows need no more.
    small, large = peak(3_000), peak(24_000)
    assert large < 1.2 * small


def test_json_of_a_row_is_plain(swept):
    row = next(r for r in swept if isinstance(r, SweepRow))
    assert json.loads(json.dumps(cells(row))) == cells(row)


def test_engine_in_this_process_is_lazy():
    assert list(in_this_process([], SKY)) == []
