"""The limits as metrics: current, force, demagnetisation, cost; `test_rotor_limits` has more."""

from __future__ import annotations

from dataclasses import replace

import machines
import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.analytic.evaluator import AnalyticEvaluator
from evaluators.interface import Evaluations
from evaluators.machine.cost import Price
from evaluators.machine.demagnetisation import Fault
from evaluators.machine.materials import library as materials
from evaluators.machine.materials.library import SleeveMaterial
from evaluators.machine.metrics import METRIC, METRICS
from evaluators.machine.quantity import MU_0
from evaluators.machine.task.cooling import Cooling
from evaluators.machine.task.rotor_layout import RotorLayout
from evaluators.machine.task.task import STANDARD_GRAVITY, Task

ROWS = 30
FIXED = Cooling(temperatures="fixed")

check_drive = OutsideChecks("drive")
check_levitation = OutsideChecks("levitation")


def run(task: Task, batch: dict[str, np.ndarray] | None = None) -> dict[str, np.ndarray]:
    chosen = machines.scattered(ROWS, seed=7) if batch is None else batch
    found: Evaluations = AnalyticEvaluator(task).evaluate(chosen)
    assert set(found.status.tolist()) == {"ok"}, found.reason
    return dict(found.metrics)


@pytest.fixture(scope="module")
def usual() -> dict[str, np.ndarray]:
    return run(machines.task())


# -- circuit ----------------------------------------------------------------------------------


def test_emf_times_current_is_torque_times_speed(usual: dict[str, np.ndarray]) -> None:
    """Power of the air gap by terminals and by Maxwell stress."""
    electrical = 1.5 * usual["back_emf_V"] * np.sqrt(2.0) * usual["torque_current_A"]
    mechanical = usual["torque_Nm"] * machines.task().duty.speed
    linear = (usual["yoke_flux_density_T"] < 1.4) & (usual["tooth_flux_density_T"] < 1.4)
    assert linear.sum() > 5
    check_drive(
        "EMF times current at the terminals",
        electrical[linear],
        mechanical[linear],
        relative=0.01,
        why="iron below 1.4 T; saturated, the analytic field leaves up to a tenth between the "
        "two routes",
        source="first law: torque by Maxwell's stress times speed",
    )


def test_currents_turns_and_wires_are_of_one_winding(usual: dict[str, np.ndarray]) -> None:
    task = machines.task()
    sections = machines.sections(task, machines.scattered(ROWS, seed=7))
    copper = usual["copper_fill"] * sections.slot_area
    wire = 0.25e-6 * np.pi * usual["wire_diameter_mm"] ** 2
    strands = 2.0 * usual["turns_per_coil"] * usual["strands_per_turn"] * wire
    np.testing.assert_allclose(strands, copper, rtol=1e-12)
    assert np.all(usual["copper_fill"] <= task.construction.copper_fill * (1.0 + 1e-8))
    current = np.sqrt(
        (usual["torque_current_A"] / usual["parallel_groups"]) ** 2
        + usual["suspension_current_A"] ** 2
    )
    np.testing.assert_allclose(usual["phase_current_A"], current, rtol=1e-12)
    density = 2.0 * usual["turns_per_coil"] * current / (copper * 1e6)
    np.testing.assert_allclose(usual["conductor_density_A_mm2"], density, rtol=1e-9)


def test_voltage_is_kept(usual: dict[str, np.ndarray]) -> None:
    more_than_one = usual["turns_per_coil"] > 1.0
    assert np.all(usual["voltage_use"][more_than_one] <= 1.0)


def test_parallel_groups_halve_voltage_and_double_current() -> None:
    # Fixed temperatures and few turns, so that nothing but the connection differs.
    task = replace(machines.task(), cooling=FIXED)
    series = run(replace(task, construction=replace(task.construction, parallel_groups=1)))
    parallel = run(replace(task, construction=replace(task.construction, parallel_groups=2)))
    for name, power in (("back_emf_V", -1), ("torque_inductance_mH", -2), ("torque_current_A", 1)):
        turns = parallel["turns_per_coil"] / series["turns_per_coil"]
        scale = {
            "back_emf_V": turns,
            "torque_inductance_mH": turns**2,
            "torque_current_A": 1 / turns,
        }
        ratio = parallel[name] / series[name] / scale[name]
        # Whole strands change the copper area by a percent, which moves nothing here.
        np.testing.assert_allclose(ratio, 2.0**power, rtol=1e-9)


# -- levitation --------------------------------------------------------------------------------


def test_levitation_budget_adds_up(usual: dict[str, np.ndarray]) -> None:
    task = machines.task()
    touchdown = 0.5e-3 * machines.scattered(ROWS, seed=7)["clearance_mm"]
    stiffness = 1e3 * usual["displacement_stiffness_N_mm"]
    np.testing.assert_allclose(usual["magnetic_pull_N"], stiffness * 0.3 * touchdown, rtol=1e-9)
    np.testing.assert_allclose(usual["zone_a_displacement_um"], 0.3e6 * touchdown, rtol=1e-9)
    mass = usual["rotor_mass_kg"]
    np.testing.assert_allclose(usual["rotor_weight_N"], STANDARD_GRAVITY * mass, rtol=1e-12)
    unbalance = mass * task.duty.balance_grade * task.duty.speed
    check_levitation(
        "unbalance force of a machine",
        usual["unbalance_force_N"],
        unbalance,
        relative=1e-12,
        why="arithmetic",
        source="ISO 21940-11: the grade times the speed is an acceleration (from memory)",
    )
    demand = usual["rotor_weight_N"] + unbalance + usual["magnetic_pull_N"]
    np.testing.assert_allclose(usual["suspension_demand_N"], demand, rtol=1e-12)
    lift = usual["rotor_weight_N"] + stiffness * touchdown
    np.testing.assert_allclose(usual["rated_force_N"] / usual["lift_off_ratio"], lift, rtol=1e-9)


def test_suspension_force_is_force_per_ampere_times_current(usual: dict[str, np.ndarray]) -> None:
    current = np.sqrt(2.0) * usual["suspension_current_A"]
    np.testing.assert_allclose(usual["force_N"], usual["force_per_ampere_N_A"] * current, rtol=2e-3)
    # The whole slot current is ten times the share of 0.1.
    np.testing.assert_allclose(usual["rated_force_N"], 10.0 * usual["force_N"], rtol=2e-3)


def test_slew_rate_uses_what_the_duty_leaves(usual: dict[str, np.ndarray]) -> None:
    duty = machines.task().duty
    left = duty.dc_link_voltage / np.sqrt(3.0) - usual["phase_voltage_V"]
    left = left - usual["residual_voltage"] * usual["back_emf_V"]
    per_ms = usual["force_per_ampere_N_A"] * left / usual["suspension_inductance_mH"]
    np.testing.assert_allclose(
        usual["force_slew_N_ms"], usual["parallel_groups"] * per_ms, rtol=1e-9
    )
    high = run(machines.task(duty={"voltage_reserve": 0.3}))
    assert np.median(high["control_bandwidth_Hz"] / usual["control_bandwidth_Hz"]) > 1.5


def test_vertical_shaft_and_process_force() -> None:
    vertical = run(machines.task(duty={"orientation": "vertical"}))
    pushed = run(machines.task(duty={"orientation": "vertical", "process_force": 12.0}))
    lying = run(machines.task())
    extra = pushed["suspension_demand_N"] - vertical["suspension_demand_N"]
    np.testing.assert_allclose(extra, 12.0, rtol=1e-9)
    weight = lying["suspension_demand_N"] - vertical["suspension_demand_N"]
    np.testing.assert_allclose(weight, lying["rotor_weight_N"], rtol=1e-9)


# -- magnets -------------------------------------------------------------------------------------


def test_margins_to_the_knee(usual: dict[str, np.ndarray]) -> None:
    magnet = machines.task().materials.magnet
    hot = np.minimum(usual["magnet_temperature_C"], 300.0)
    remanence = magnet.remanence.at(hot)
    knee = remanence - MU_0 * magnet.recoil_permeability.at(hot) * magnet.knee_ratio.at(
        hot
    ) * magnet.coercivity.at(hot)
    np.testing.assert_allclose(usual["knee_flux_density_T"], np.minimum(knee, remanence))
    np.testing.assert_allclose(
        usual["demagnetisation_margin_T"],
        usual["magnet_flux_density_T"] - usual["knee_flux_density_T"],
        atol=1e-12,
    )
    assert np.all(usual["fault_magnet_flux_density_T"] < usual["magnet_flux_density_T"])


def test_stated_fault_current_counts_in_proportion() -> None:
    task = replace(machines.task(), cooling=FIXED)
    found = [
        run(replace(task, fault=Fault(kind="current", current_ratio=ratio)))
        for ratio in (0.0, 1.0, 3.0)
    ]
    fall = [item["magnet_flux_density_T"] - item["fault_magnet_flux_density_T"] for item in found]
    np.testing.assert_allclose(fall[0], 0.0, atol=1e-12)
    np.testing.assert_allclose(fall[2], 3.0 * fall[1], rtol=1e-9)
    np.testing.assert_allclose(found[2]["fault_current_ratio"], 3.0)


def test_short_circuit_swings_up_to_twice_flux_over_inductance() -> None:
    found = run(replace(machines.task(), cooling=FIXED))
    omega = 2.0 * np.pi * machines.task().electrical_frequency
    steady = found["back_emf_V"] / (omega * 1e-3 * found["torque_inductance_mH"])
    rated = np.sqrt(2.0) * found["torque_current_A"]
    peak = found["fault_current_ratio"] * rated
    assert np.all(peak > 0.9 * steady)
    OutsideChecks("demagnetisation").within(
        "short-circuit peak of machines over the widest circle of the current",
        peak / (steady + np.hypot(steady, rated)),
        -np.inf,
        1.0,
        why="resistance shrinks the circle; from the duty's current it is a little wider than "
        "from no load",
        source="circle of constant flux linkage (common practice)",
    )


# -- cost and registry ----------------------------------------------------------------------------


def test_cost_scenarios() -> None:
    task = machines.task()
    magnet = Price(90.0, low_per_kg=60.0, high_per_kg=150.0)
    found = run(replace(task, prices=replace(task.prices, magnet=magnet)))
    np.testing.assert_allclose(
        found["cost"] - found["cost_low"], 30.0 * found["magnet_mass_kg"], rtol=1e-9
    )
    np.testing.assert_allclose(
        found["cost_high"] - found["cost"], 60.0 * found["magnet_mass_kg"], rtol=1e-9
    )


def test_every_metric_is_explained_and_carries_its_unit() -> None:
    suffix = {
        "N m": "Nm", "N/A": "N_A", "N/mm": "N_mm", "N/ms": "N_ms", "A/mm2": "A_mm2", "m/s": "m_s",
        "W/cm2": "W_cm2", "N m/L": "Nm_L", "degC": "C", "r/min": "rpm",
    }  # fmt: skip
    assert len(METRIC) == len(METRICS)
    for metric in METRICS:
        assert metric.definition, metric.name
        assert metric.source, metric.name
        if metric.unit not in ("1", "money"):
            assert metric.name.endswith("_" + suffix.get(metric.unit, metric.unit)), metric.name


# -- what a study may not ask ------------------------------------------------------------------


def test_coolant_colder_than_the_surroundings_is_refused() -> None:
    task = machines.task()
    with pytest.raises(
        ValueError, match=r"coolant_temperature = 15 C must not be below the ambient .* 40 C"
    ):
        replace(task, cooling=Cooling(coolant_temperature=15.0))
    dry = Cooling(coolant_temperature=15.0, condensation_prevented=True)
    cool = run(replace(task, cooling=dry))
    assert np.all(cool["magnet_temperature_C"] < run(task)["magnet_temperature_C"])


def test_material_outside_its_table_is_refused() -> None:
    task = machines.task()
    hot = replace(task.conditions, sleeve_temperature=170.0)
    with pytest.raises(
        ValueError,
        match=r"sleeve_temperature = 170 C .* 'Carbon fibre, wound', which reach from 20 to 150 C",
    ):
        replace(task, conditions=hot)
    metal = materials.load(SleeveMaterial, "NiCr19NbMo")
    assert (
        replace(
            task, conditions=hot, materials=replace(task.materials, sleeve=metal)
        ).conditions.sleeve_temperature
        == 170.0
    )
    scorched = replace(task.conditions, magnet_temperature=250.0)
    with pytest.raises(ValueError, match="magnet_temperature = 250 C"):
        replace(task, conditions=scorched)


@pytest.mark.parametrize(("key", "value", "words"), [
    ("coolant_flow", 0.0, r"coolant_flow \(m3/s\) = 0 must lie between 1e-07 and 1"),
    ("insulation_class", "C", "insulation_class = 'C' must be A, E, B, F or H"),
    ("method", "ice", "method = 'ice' must be jacket, forced air or coefficient"),
    ("joint_conductance", float("nan"), "joint_conductance"),
])  # fmt: skip
def test_bad_cooling_is_refused(key: str, value: object, words: str) -> None:
    with pytest.raises(ValueError, match=words):
        Cooling(**{key: value})  # type: ignore[arg-type]


def test_bad_rotor_and_prices_are_refused() -> None:
    with pytest.raises(ValueError, match=r"overhung_mass \(kg\) = -1 must lie between 0"):
        RotorLayout(overhung_mass=-1.0)
    with pytest.raises(ValueError, match=r"touchdown_ratio = 2 must lie between 0.05 and 0.95"):
        RotorLayout(touchdown_ratio=2.0)
    with pytest.raises(ValueError, match=r"low_per_kg = 12.0, per_kg = 10.0"):
        Price(10.0, low_per_kg=12.0)
    with pytest.raises(ValueError, match=r"highest_speed_ratio = 1.5 must not exceed"):
        machines.task(duty={"highest_speed_ratio": 1.5})
