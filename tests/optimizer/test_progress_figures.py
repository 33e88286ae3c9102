"""Rates and counts on a clock of the test's own."""

from __future__ import annotations

import math

import numpy as np
import pytest

from optimizer.fronts import Front
from optimizer.problem import Outcome
from optimizer.running import meter as meter_module
from optimizer.running.meter import WINDOW_S, Meter
from optimizer.running.progress import Progress
from optimizer.running.tally import BOX_ROWS, Tally


class Clock:
    now = 1000.0

    def monotonic(self) -> float:
        return self.now


@pytest.fixture
def clock(monkeypatch) -> Clock:
    made = Clock()
    monkeypatch.setattr(meter_module, "time", made)
    return made


def test_the_rate_is_that_of_the_last_half_minute_of_work(clock) -> None:
    said: list[Progress] = []
    meter = Meter(said.append, 10_000)
    clock.now += 500.0  # reading the archive
    meter.start()
    assert math.isnan(meter.rate())
    for _ in range(20):
        clock.now += 1.0
        meter.evaluated(10)
    assert meter.rate() == pytest.approx(10.0)  # sums of whole seconds
    for _ in range(3 * int(WINDOW_S)):
        clock.now += 1.0
        meter.evaluated(40)
        meter.start()  # a new generation does not start the clock again
    assert meter.rate() == pytest.approx(40.0)
    meter.show(4_000, Tally(), Front(2))
    assert said[-1].seconds_left == pytest.approx(6_000 / 40.0)


def test_reports_are_not_more_frequent_than_useful(clock) -> None:
    said: list[Progress] = []
    meter = Meter(said.append, 100)
    for _ in range(1_000):
        clock.now += 0.01
        meter.show(0, Tally(), Front(2))
    assert 40 <= len(said) <= 51  # ten seconds, five a second
    meter.show(0, Tally(), Front(2), always=True)
    assert len(said) <= 52


def test_the_box_is_closed_by_whole_generations_only() -> None:
    # Otherwise it would depend on where a run was interrupted.
    points = np.random.default_rng(1).random((2 * BOX_ROWS, 2))
    outcome = Outcome(points, np.zeros((len(points), 0)))
    front = Front(2)
    front.add(points, np.arange(len(points)))
    tally = Tally()
    tally.add(np.arange(len(points)), outcome, whole=False)
    assert tally.volume(front) == 0.0
    assert tally.feasible == len(points)
    tally.add(np.arange(len(points)), outcome)
    assert tally.volume(front) > 0.0
    again = Tally()
    again.restore(tally.values())
    assert again.volume(front) == tally.volume(front)
