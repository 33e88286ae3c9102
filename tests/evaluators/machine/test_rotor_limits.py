"""The limits of the rotor as metrics: bending speeds, contact and strength of the sleeve."""

from __future__ import annotations

from dataclasses import replace

import machines
import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.analytic.evaluator import AnalyticEvaluator
from evaluators.interface import Evaluations
from evaluators.machine.performance.mechanics import interference_verdict
from evaluators.machine.task.cooling import Cooling
from evaluators.machine.task.rotor_layout import RotorLayout
from evaluators.machine.task.task import Task

ROWS = 30
FIXED = Cooling(temperatures="fixed")

check = OutsideChecks("mechanics")


def run(task: Task, batch: dict[str, np.ndarray] | None = None) -> dict[str, np.ndarray]:
    chosen = machines.scattered(ROWS, seed=7) if batch is None else batch
    found: Evaluations = AnalyticEvaluator(task).evaluate(chosen)
    assert set(found.status.tolist()) == {"ok"}, found.reason
    return dict(found.metrics)


@pytest.fixture(scope="module")
def usual() -> dict[str, np.ndarray]:
    return run(machines.task())


def test_mounted_mass_weighs_and_slows_the_bending(usual: dict[str, np.ndarray]) -> None:
    layout = RotorLayout(overhung_mass=0.4, overhung_offset=0.01, overhung_transverse_inertia=2e-4)
    loaded = run(replace(machines.task(), rotor=layout))
    np.testing.assert_allclose(loaded["rotor_mass_kg"] - usual["rotor_mass_kg"], 0.4, rtol=1e-9)
    assert np.all(loaded["free_bending_speed_rpm"] < usual["free_bending_speed_rpm"])
    # Springs raise every mode (Rayleigh). A rotor as soft as its suspension bends earlier, in a
    # mode that was rigid without it; four times the rigid rotor's speed is far from that.
    stiff = loaded["free_bending_speed_rpm"] > 4.0 * 60.0 * loaded["unstable_pole_Hz"]
    assert stiff.sum() > ROWS // 2
    raised = loaded["bending_speed_rpm"] >= loaded["free_bending_speed_rpm"] * (1 - 1e-9)
    assert np.all(raised[stiff])


def test_bending_of_a_plain_shaft() -> None:
    """Next to no core, magnets and sleeve: the closed form of a free round shaft."""
    batch = machines.designs(1, core_ratio=0.95, magnet_thickness_mm=0.3, sleeve_thickness_mm=0.1)
    task = replace(machines.task(), rotor=RotorLayout(shaft_end_ratio=1.0))
    found = run(task, batch)
    sections = machines.sections(task, batch)
    shaft = task.materials.shaft
    young, rho = float(shaft.young_modulus.at(80.0)), float(shaft.density.value)
    length = 1e-3 * found["stack_length_mm"] + 4.0 * sections.rotor_radius
    euler = 4.730041**2 / length**2 * np.sqrt(young / rho) * 0.5 * sections.shaft_radius
    check.within(
        "first bending speed of a machine that is nearly a plain shaft, over that of the shaft",
        found["free_bending_speed_rpm"][0] * np.pi / 30.0 / euler[0],
        0.75,
        1.0,
        why="core, magnets and sleeve add a fifth of mass along the stack and no stiffness; shear "
        "and rotation of a stocky shaft take some per cent more",
        source="free beam of Euler and Bernoulli, beta L = 4.730041",
    )


def slender(duty_speed_ratio: float, layout: RotorLayout) -> tuple[Task, dict[str, np.ndarray]]:
    """A plain shaft, and a speed range at a multiple of its first bending speed hanging free."""
    batch = machines.designs(1, core_ratio=0.95, magnet_thickness_mm=0.3, sleeve_thickness_mm=0.1)
    task = replace(machines.task(), rotor=layout, cooling=FIXED)
    first = run(task, batch)["free_bending_speed_rpm"][0] * np.pi / 30.0
    # The duty stays, and with it the shaft; only the range of continuous speeds moves.
    ratio = duty_speed_ratio * first / task.duty.speed
    duty = replace(
        task.duty, overspeed_ratio=1.0, lowest_speed_ratio=min(ratio, 1.0), highest_speed_ratio=1.0
    )
    return replace(task, duty=duty), batch


def test_second_bending_speed_counts_for_the_margin() -> None:
    """A free shaft bends at 1 and (7.8532/4.7300)^2 = 2.76 times its first bending speed.

    A rotor whose range begins at twice its first bending speed and reaches past its second must
    not pass: it is clear of the first one only.
    """
    layout = RotorLayout(drive_end_length=0.4, free_end_length=0.4, suspension_stiffness=1.0)
    task, batch = slender(2.0, layout)
    found = run(task, batch)
    speeds = 30.0 / np.pi * task.duty.speed * np.array([task.duty.lowest_speed_ratio, 1.0])
    first = found["free_bending_speed_rpm"][0]
    assert first / speeds[0] == pytest.approx(0.5, rel=1e-6)
    assert speeds[1] > 2.76 * first  # the second lies in the range: shear only lowers it
    assert found["separation_margin"][0] < 0.0


def test_stiff_second_bearing_makes_the_rotor_bend_earlier() -> None:
    """A beam pinned at one end bends at beta L = 3.9266, a free one at 4.7300 (closed forms)."""
    layout = RotorLayout(
        drive_end_length=0.5,
        free_end_length=5e-3,
        suspension_stiffness=1.0,
        bearing_stiffness=1e10,
    )
    _, batch = slender(1.0, layout)
    found = run(replace(machines.task(), rotor=layout, cooling=FIXED), batch)
    ratio = found["bending_speed_rpm"][0] / found["free_bending_speed_rpm"][0]
    check(
        "bending speed of a shaft pinned at one end over that of a free one",
        ratio,
        (3.9266 / 4.7300) ** 2,
        relative=0.05,
        why="core, magnets and sleeve load a tenth of the length near the pin, where little "
        "moves; the pin sits half a hundredth of the length from the tip",
        source="beams of Euler and Bernoulli, beta L = 3.9266 and 4.7300",
    )


def test_contact_is_kept_cold_and_hot() -> None:
    """Heat loosens a nickel sleeve and tightens a fibre: the worse of both counts."""
    for sleeve in ("NiCr19NbMo", "Carbon fibre, wound"):
        found = run(machines.task(sleeve=sleeve))
        np.testing.assert_allclose(found["contact_pressure_MPa"], 2.0, rtol=1e-6)  # the default
        assert np.all(found["lift_off_speed_ratio"] > 1.0)
        assert np.all(found["magnet_stress_ratio"] < 1.0)


def test_core_is_a_sheet_with_a_hole(usual: dict[str, np.ndarray]) -> None:
    task = machines.task()
    sections = machines.sections(task, machines.scattered(ROWS, seed=7))
    a, b = sections.shaft_radius, sections.core_radius
    density = float(task.materials.rotor_steel.density.value)
    poisson = float(task.materials.shaft.poisson_ratio.value)
    speed = task.duty.speed * task.duty.overspeed_ratio
    turning = density * speed**2 / 4.0 * ((3.0 + poisson) * b**2 + (1.0 - poisson) * a**2)
    tension = turning - 2e6 * usual["contact_pressure_MPa"] * b**2 / (b**2 - a**2)
    stress = 1e6 * usual["core_stress_MPa"]
    pulled = stress < 1.01 * tension  # in the others the sleeve's pressure at rest decides
    assert 0 < pulled.sum() < ROWS
    check(
        "stress of rotor cores at the bore",
        stress[pulled],
        tension[pulled],
        relative=1e-9,
        why="the same closed form, so rounding only",
        source="Roark, tables on rotating discs and thick vessels (from memory), written out",
    )
    assert np.all(stress > tension * (1.0 - 1e-9))


def test_window_ends_at_the_strength() -> None:
    task = machines.task(sleeve="NiCr19NbMo")
    usual = run(task)
    largest = usual["sleeve_interference_um"] + usual["interference_window_um"]
    row = int(np.argmax(usual["interference_window_um"]))
    batch = {name: column[[row]] for name, column in machines.scattered(ROWS, seed=7).items()}
    fitted = replace(task.construction, sleeve_interference=1e-6 * float(largest[row]))
    found = run(replace(task, construction=fitted), batch)
    assert found["sleeve_stress_ratio"][0] == pytest.approx(1.0, rel=0.01)  # two secants


def test_given_interference_too_small_shows() -> None:
    loose = run(machines.task(construction={"sleeve_interference": 0.0}))
    assert np.all(loose["contact_pressure_MPa"] < 0.0)
    assert np.all(loose["lift_off_speed_ratio"] < 1.0)
    np.testing.assert_allclose(
        loose["interference_window_um"], run(machines.task())["interference_window_um"], rtol=0.02
    )


def test_verdict_names_both_interferences() -> None:
    assert "no interference holds" in interference_verdict(80.0, -30.0)
    assert "50 um" in interference_verdict(80.0, -30.0)
    assert "from 80 um" in interference_verdict(80.0, 40.0)
    assert "120 um" in interference_verdict(80.0, 40.0)


def test_sleeve_that_holds_at_no_interference_is_a_failed_row() -> None:
    """rho (w r)² of the sleeve alone: titanium at 900 m/s carries some 3600 MPa."""
    task = machines.task(sleeve="TiAl6V4", duty={"speed": 4.0 * machines.task().duty.speed})
    found = AnalyticEvaluator(task).evaluate(machines.designs(1, rotor_radius_mm=38.0))
    assert found.status.tolist() == ["failed"]
    assert "the sleeve holds at no interference" in found.reason[0]
    assert "'TiAl6V4'" in found.reason[0]
