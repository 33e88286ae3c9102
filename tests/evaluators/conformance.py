"""The contract of `evaluators.interface` as tests that any evaluator inherits.

    from conformance import EvaluatorConformance
    from machines import FAMILIES

    @pytest.mark.parametrize("numbers", FAMILIES, scope="class")
    class TestMine(EvaluatorConformance):
        name = "mine"
        bad_settings = ({"finesse": -1},)

        def build(self, task):
            return MyEvaluator(task, {})

`numbers` are slots, pole pairs and suspension pole pairs of the family. A third-party package can
do the same with this folder on its `pythonpath`.
"""

from __future__ import annotations

import pickle
from collections.abc import Mapping
from typing import ClassVar

import machines
import numpy as np
import pytest
from numpy.typing import NDArray

from evaluators import interface
from evaluators.interface import Capability, Evaluations, Evaluator, EvaluatorError, Status
from evaluators.machine.geometry.variables import VARIABLE_NAMES
from evaluators.machine.metrics import METRICS
from evaluators.machine.task.task import Task

FloatArray = NDArray[np.float64]
ROWS = 12
TURN = "rotor angle, rad"

INVALID: dict[str, dict[str, float]] = {
    "no room for a shaft": {"magnet_thickness_mm": 19.0},
    "closed slot": {"tip_span_ratio": 1.999},
    "negative length": {"clearance_mm": -0.5},
    "not a number": {"yoke_ratio": float("nan")},
    "infinite": {"slot_depth_ratio": float("inf")},
}


class EvaluatorConformance:
    """Inherit, state the class attributes, and write `build`."""

    name: ClassVar[str]
    """Entry point under which the evaluator is installed."""
    settings: ClassVar[Mapping[str, object]] = {}
    """Settings with which `build` makes the evaluator."""
    bad_settings: ClassVar[tuple[Mapping[str, object], ...]] = ({"no_such_setting": 1},)
    """Settings of one key each that must be refused."""
    independence: ClassVar[float] = 1e-9
    """Largest relative difference of a row evaluated alone and in a batch: rounding of sums whose
    order depends on the size of the batch. The default allows six digits of cancellation."""
    metrics: ClassVar[tuple[str, ...]] = tuple(metric.name for metric in METRICS)

    def build(self, task: Task) -> Evaluator:
        raise NotImplementedError

    # -- fixtures ---------------------------------------------------------------------------

    @pytest.fixture(scope="class")
    @classmethod
    def task(cls, numbers: machines.Numbers) -> Task:
        return machines.task(*numbers)

    @pytest.fixture(scope="class")
    @classmethod
    def evaluator(cls, task: Task) -> Evaluator:
        return cls().build(task)

    @pytest.fixture(scope="class")
    @classmethod
    def batch(cls) -> dict[str, FloatArray]:
        """Real cross-sections with one impossible row among them."""
        batch = machines.scattered(ROWS, seed=5)
        batch["magnet_thickness_mm"][3] = 19.0
        return batch

    @pytest.fixture(scope="class")
    @classmethod
    def result(cls, evaluator: Evaluator, batch: dict[str, FloatArray]) -> Evaluations:
        return evaluator.evaluate(batch)

    # -- what it says of itself ---------------------------------------------------------------

    def test_satisfies_the_protocol(self, evaluator: Evaluator) -> None:
        assert isinstance(evaluator, Evaluator)
        assert evaluator.name == self.name
        assert evaluator.version
        assert isinstance(evaluator.capabilities, frozenset)
        assert all(isinstance(item, Capability) for item in evaluator.capabilities)
        assert evaluator.metrics == self.metrics

    @pytest.mark.usefixtures("entry_points_found")
    def test_is_found_by_entry_point(self, task: Task, evaluator: Evaluator) -> None:
        found = interface.build(self.name, task, self.settings)
        assert type(found) is type(evaluator)
        assert found.version == evaluator.version

    @pytest.mark.usefixtures("entry_points_found")
    def test_refuses_bad_settings_by_name(self, task: Task) -> None:
        for settings in self.bad_settings:
            (key,) = settings
            with pytest.raises(EvaluatorError, match=key):
                interface.build(self.name, task, settings)

    # -- rows ---------------------------------------------------------------------------------

    def test_returns_every_metric_for_every_row(self, result: Evaluations) -> None:
        assert tuple(result.metrics) == self.metrics
        assert all(column.dtype == np.float64 for column in result.metrics.values())
        assert result.status.shape == result.reason.shape == (ROWS,)
        assert set(result.status.tolist()) <= {item.value for item in Status}

    def test_ok_rows_are_finite_and_others_say_why(self, result: Evaluations) -> None:
        ok = result.status == Status.OK
        assert ok.sum() >= ROWS // 2  # else this suite tests little
        for name, column in result.metrics.items():
            assert np.isfinite(column[ok]).all(), name
            assert np.isnan(column[~ok]).all(), name
        assert (result.reason[ok] == "").all()
        assert all(result.reason[~ok].tolist())

    def test_impossible_row_is_invalid_geometry(self, result: Evaluations) -> None:
        assert result.status[3] == Status.INVALID_GEOMETRY
        assert "magnet_thickness_mm" in result.reason[3]

    @pytest.mark.parametrize("change", INVALID.values(), ids=INVALID.keys())
    def test_no_cross_section_is_a_row(
        self, evaluator: Evaluator, change: dict[str, float]
    ) -> None:
        result = evaluator.evaluate(machines.designs(**change))
        assert result.status.tolist() == [Status.INVALID_GEOMETRY.value]
        assert result.reason[0]
        assert "\n" not in result.reason[0]
        assert all(np.isnan(column).all() for column in result.metrics.values())

    def test_row_that_cannot_do_the_duty_fails_alone(self, evaluator: Evaluator) -> None:
        # A real cross-section, but its current does not even overcome the friction in the gap.
        batch = machines.designs(2)
        batch["current_density_A_mm2"][1] = 1e-3
        result = evaluator.evaluate(batch)
        assert result.status.tolist() == [Status.OK.value, Status.FAILED.value]
        assert result.reason[1]
        for column in result.metrics.values():
            assert np.isfinite(column[0])
            assert np.isnan(column[1])

    def test_empty_batch(self, evaluator: Evaluator) -> None:
        result = evaluator.evaluate(machines.designs(0))
        assert result.status.shape == (0,)
        assert tuple(result.metrics) == self.metrics
        assert all(column.shape == (0,) for column in result.metrics.values())

    # -- purity -------------------------------------------------------------------------------

    def test_repeats_bit_for_bit(
        self, evaluator: Evaluator, batch: dict[str, FloatArray], result: Evaluations
    ) -> None:
        evaluator.evaluate(machines.scattered(2, seed=9))  # must leave no trace
        assert_identical(evaluator.evaluate(batch), result)

    def test_leaves_inputs_alone(self, evaluator: Evaluator) -> None:
        batch = machines.scattered(2, seed=1)
        before = {name: column.copy() for name, column in batch.items()}
        for column in batch.values():
            column.setflags(write=False)
        evaluator.evaluate(batch)
        assert batch.keys() == before.keys()
        for name, column in batch.items():
            assert np.array_equal(column, before[name])

    def test_row_does_not_depend_on_its_batch(
        self, evaluator: Evaluator, batch: dict[str, FloatArray], result: Evaluations
    ) -> None:
        for row in (0, 3, ROWS - 1):
            alone = evaluator.evaluate({name: batch[name][[row]] for name in batch})
            assert_close(alone, result, np.array([row]), self.independence)

    def test_keeps_the_order_of_rows(
        self, evaluator: Evaluator, batch: dict[str, FloatArray], result: Evaluations
    ) -> None:
        order = np.arange(ROWS)[::-1]
        turned = evaluator.evaluate({name: batch[name][order] for name in batch})
        assert_close(turned, result, order, self.independence)

    def test_works_after_pickling(
        self, evaluator: Evaluator, batch: dict[str, FloatArray], result: Evaluations
    ) -> None:
        # As it is sent to worker processes.
        copy = pickle.loads(pickle.dumps(evaluator))  # noqa: S301
        assert_identical(copy.evaluate(batch), result)

    # -- calling errors -----------------------------------------------------------------------

    @pytest.mark.parametrize("name", [VARIABLE_NAMES[0], VARIABLE_NAMES[-1]])
    def test_missing_variable_raises(self, evaluator: Evaluator, name: str) -> None:
        batch = machines.designs(2)
        del batch[name]
        with pytest.raises(ValueError, match=name):
            evaluator.evaluate(batch)

    @pytest.mark.parametrize("shape", [(3,), (2, 1), ()])
    def test_unequal_lengths_raise(self, evaluator: Evaluator, shape: tuple[int, ...]) -> None:
        batch = machines.designs(2)
        batch["yoke_ratio"] = np.ones(shape)
        with pytest.raises(ValueError, match="yoke_ratio"):
            evaluator.evaluate(batch)

    # -- sense --------------------------------------------------------------------------------

    def test_metrics_fit_together(self, result: Evaluations, task: Task) -> None:
        ok = result.status == Status.OK
        value = {name: column[ok] for name, column in result.metrics.items()}
        parts = ("copper", "iron", "magnet", "sleeve", "air_friction")
        total = sum(value[f"loss_{part}_W"] for part in parts)
        power = task.duty.power
        # Sums of the same numbers: rounding only.
        np.testing.assert_allclose(value["loss_total_W"], total, rtol=1e-12)
        np.testing.assert_allclose(value["efficiency"], power / (power + total), rtol=1e-12)
        places = value["loss_teeth_W"] + value["loss_yoke_W"]
        mechanisms = [value[f"loss_iron_{name}_W"] for name in ("hysteresis", "eddy", "excess")]
        np.testing.assert_allclose(value["loss_iron_W"], places, rtol=1e-12)
        np.testing.assert_allclose(value["loss_iron_W"], np.sum(mechanisms, axis=0), rtol=1e-12)
        assert np.all(np.array(mechanisms) >= 0.0)
        # All that brakes the rotor; a field solved with induced currents has theirs in it.
        braked = power + value["loss_air_friction_W"] + value["loss_iron_W"]
        rotor = value["loss_magnet_W"] + value["loss_sleeve_W"]
        made = value["torque_Nm"] * task.duty.speed
        induced = np.any(value["force_angle_bias_deg"] != 0.0)
        np.testing.assert_allclose(made, braked if induced else braked + rotor, rtol=1e-9)
        np.testing.assert_allclose(
            value["force_per_weight"], value["force_N"] / value["rotor_weight_N"], rtol=1e-12
        )
        for part in parts:
            assert (value[f"loss_{part}_W"] >= 0.0).all()

    # -- waveforms ----------------------------------------------------------------------------

    @pytest.fixture(scope="class")
    @classmethod
    def waves(cls, evaluator: Evaluator) -> dict[str, interface.Waveform]:
        if Capability.WAVEFORMS not in evaluator.capabilities:
            pytest.skip("declares no waveforms")
        return {wave.name: wave for wave in evaluator.waveforms(machines.DESIGN)}

    def test_waveforms_cover_one_turn(self, waves: dict[str, interface.Waveform]) -> None:
        assert {"torque", "force along x, commanded along x"} <= waves.keys()
        for wave in waves.values():
            assert wave.unit
            assert wave.positions.shape == wave.values.shape
            assert np.isfinite(wave.values).all()
            step = np.diff(wave.positions)
            assert (step > 0.0).all()
            if wave.axis == TURN:
                # Equal steps from zero, the end point is the beginning of the next turn.
                assert wave.positions[0] == 0.0
                np.testing.assert_allclose(step, step[0], rtol=1e-9)
                assert wave.positions[-1] + step[0] == pytest.approx(2.0 * np.pi, rel=1e-9)

    def test_waveforms_agree_with_metrics(
        self, evaluator: Evaluator, waves: dict[str, interface.Waveform]
    ) -> None:
        result = evaluator.evaluate(machines.designs())
        value = {name: float(column[0]) for name, column in result.metrics.items()}
        length = 1e-3 * value["stack_length_mm"]
        torque = waves["torque"].values
        # Waveforms hold at the magnet temperature of the study, metrics at the solved one.
        task = machines.task()
        remanence = task.materials.magnet.remanence
        warm = float(
            remanence.at(value["magnet_temperature_C"])
            / remanence.at(task.conditions.magnet_temperature)
        )
        # The same numbers by the same route, so rounding only.
        assert torque.mean() * warm * length == pytest.approx(value["torque_Nm"], rel=1e-6)
        assert np.ptp(torque) / torque.mean() == pytest.approx(value["torque_ripple"], rel=1e-6)
        along = waves["force along x, commanded along x"].values
        across = waves["force along y, commanded along x"].values
        mean = along.mean() + 1j * across.mean()
        assert abs(mean) * warm * length == pytest.approx(value["force_N"], rel=1e-3)
        # The command points along x; the angle left is that of eddy currents, if any are solved.
        assert abs(np.angle(mean, deg=True)) < 10.0

    def test_waveforms_of_no_cross_section_raise(
        self, evaluator: Evaluator, waves: dict[str, interface.Waveform]
    ) -> None:
        assert waves
        with pytest.raises(ValueError, match="magnet_thickness_mm"):
            evaluator.waveforms({**machines.DESIGN, "magnet_thickness_mm": 19.0})


def assert_identical(first: Evaluations, second: Evaluations) -> None:
    """Every number, status and reason the same, NaN included."""
    assert first.status.tolist() == second.status.tolist()
    assert first.reason.tolist() == second.reason.tolist()
    for name, column in first.metrics.items():
        assert np.array_equal(column, second.metrics[name], equal_nan=True), name


def assert_close(
    part: Evaluations, whole: Evaluations, rows: NDArray[np.int64], tolerance: float
) -> None:
    """`part` equals the stated rows of `whole`, relative to the column's largest number."""
    assert part.status.tolist() == whole.status[rows].tolist()
    assert part.reason.tolist() == whole.reason[rows].tolist()
    for name, column in part.metrics.items():
        scale = np.nanmax(np.abs(whole.metrics[name]))
        np.testing.assert_allclose(
            column, whole.metrics[name][rows], rtol=tolerance, atol=tolerance * scale, err_msg=name
        )
