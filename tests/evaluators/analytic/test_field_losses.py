"""Iron loss and rotor eddy waves of the analytic field, recomputed by other routes."""

from __future__ import annotations

from dataclasses import dataclass, replace

import machines
import numpy as np
import pytest
from numpy.typing import NDArray
from outside import OutsideChecks

from evaluators.analytic import losses
from evaluators.analytic.model import AnalyticModel, Resolution, Waves
from evaluators.machine.field import Excitation
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.losses.eddy import RotorEddyLoss
from evaluators.machine.losses.iron import IronLossCoefficients

FloatArray = NDArray[np.float64]
CLASSICAL = 4e-5  # W/kg per (Hz T)^2
COARSE = Resolution(slot_modes=3, reach=8, highest_order=60, positions=8)

check = OutsideChecks("losses")


@dataclass
class Case:
    model: AnalyticModel
    sections: CrossSections
    exciting: Excitation
    waves: Waves


def machine(
    numbers: machines.Numbers, suspension: float, only_fundamental: bool, **changes: float
) -> Case:
    """Ideal iron whose only loss is classical; hardly any torque current."""
    of = machines.task(*numbers, ideal_iron=True)
    classical = IronLossCoefficients(hysteresis=0.0, exponent=2.0, classical=CLASSICAL, excess=0.0)
    steel = replace(of.materials.stator_steel, losses=classical)
    of = replace(of, materials=replace(of.materials, stator_steel=steel))
    model = AnalyticModel(of, COARSE)
    if only_fundamental:
        model.rotation = replace(model.rotation, magnet_orders=model.rotation.magnet_orders[:1])
    sections = machines.sections(of, machines.designs(**changes))
    exciting = Excitation(np.array([1e-9]), np.array([suspension]))
    return Case(model, sections, exciting, model.waves(sections, exciting)[0])


def iron(case: Case) -> losses.IronState:
    model = case.model
    return losses.iron(
        model.task,
        model.rotation,
        model.linkage,
        case.sections,
        case.waves,
        case.exciting,
        model.stacking,
    )


def per_volume(case: Case) -> float:
    """W/m3 of stack per T^2 of mean density squared amplitude: the iron holds B over stacking."""
    steel = case.model.task.materials.stator_steel
    frequency = case.model.task.electrical_frequency
    stacking = case.model.stacking
    return CLASSICAL * frequency**2 * float(steel.density.value) / stacking


# The derivative of 96 chords is (pi/96)^2/3 below that of a sine.
CHORDS = 1.0 - (np.pi / 96) ** 2 / 3.0


@pytest.mark.parametrize("yoke_ratio", [0.5, 2.0, 5.0])
def test_yoke_loss_of_a_sine_by_quadrature(yoke_ratio: float) -> None:
    case = machine((12, 2, 1), 1e-9, only_fundamental=True, yoke_ratio=yoke_ratio)
    inner, outer = float(case.sections.slot_radius[0]), float(case.sections.outer_radius[0])
    order = 2
    potential = 2.0 * abs(case.waves.magnets.slot[0, 0])
    radius = np.linspace(inner, outer, 4001)
    depth = np.sinh(order * np.log(outer / inner))
    radial = potential * order / radius * np.sinh(order * np.log(outer / radius)) / depth
    across = potential * order / radius * np.cosh(order * np.log(outer / radius)) / depth
    square = np.trapezoid((radial**2 + across**2) * 2.0 * np.pi * radius, radius)
    expected = per_volume(case) * square * CHORDS
    check(
        "classical loss of the yoke in a field of one order",
        iron(case).yoke.total[0],
        expected,
        relative=1e-5,
        why="4000 trapezoids",
        source="plane field in a ring, A ~ sinh(p ln(Ro/r)), integrated over its area",
    )


def test_tooth_loss_of_a_sine_by_hand() -> None:
    case = machine((12, 4, 5), 1e-9, only_fundamental=True)
    # A tooth carries the difference of two slots a third of a period apart: sqrt(3) times one.
    flux = 2.0 * abs(case.waves.magnets.slot[0, 0]) * np.sqrt(3.0)
    density = flux / float(case.sections.tooth_width[0])
    expected = per_volume(case) * density**2 * float(case.sections.teeth_area[0]) * CHORDS
    check(
        "classical loss of the teeth in a field of one order",
        iron(case).teeth.total[0],
        expected,
        relative=1e-6,
        why="the chords of the samples are taken into account: rounding",
        source="k (f B)² by hand",
    )


def test_suspension_adds_its_square() -> None:
    low, *rest = (
        iron(machine((12, 4, 5), share, only_fundamental=False)) for share in (1e-9, 50.0, 100.0)
    )
    for part in ("teeth", "yoke"):
        added = [
            float(getattr(state, part).total[0] - getattr(low, part).total[0]) for state in rest
        ]
        assert added[0] > 0.0
        assert added[1] / added[0] == pytest.approx(4.0, rel=1e-6)


@pytest.mark.parametrize("numbers", [(6, 2, 1), (12, 5, 4)], ids=str)
def test_waves_against_the_rotor(
    numbers: machines.Numbers, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Orders and frequencies that the rotor sees, against a transform of the sampled field.

    The field at the sleeve is sampled on rotor-fixed points at instants of one turn and transformed
    over angle and time; squares of all waves of one order and one frequency must agree.
    """
    case = machine(numbers, 80.0, only_fundamental=False)
    case.exciting = Excitation(np.array([600.0]), np.array([80.0]))
    waves = case.model.waves(case.sections, case.exciting)[0]
    seen: dict[str, FloatArray] = {}

    def catch(
        order: FloatArray, frequency: FloatArray, density: FloatArray, **_: object
    ) -> RotorEddyLoss:
        seen.update(order=order, frequency=frequency, density=density[0])
        return RotorEddyLoss(density, density)

    monkeypatch.setattr(losses, "rotor_eddy_loss", catch)
    rotation = case.model.rotation
    losses.rotor_eddy(
        case.model.task, rotation, case.sections, waves, case.exciting, np.array([0.05]), 1.05
    )

    # Sampled: stator field of every position on points that turn with the rotor. The suspension's
    # wave is not in phase with the others by agreement, so it is sampled by itself.
    instants, points = 512, 256
    turn = 2.0 * np.pi * np.arange(instants) / instants
    order = np.arange(1, rotation.highest_order + 1)
    radius, bore = float(case.sections.rotor_radius[0]), float(case.sections.bore_radius[0])
    ratio = (radius / bore) ** order

    def rotor_view(part: str, exponents: FloatArray) -> FloatArray:
        rising, falling = rotation.dense(getattr(waves, part))
        at_radius = rising[0] * ratio[:, None] + falling[0] / ratio[:, None]
        stator = at_radius @ np.exp(1j * exponents[:, None] * turn)
        return stator * np.exp(1j * order[:, None] * turn)  # (order, instant), in the rotor frame

    control = waves.suspension.orders.shape[0]
    drive = waves.current.orders.shape[0]
    pair = rotation.pole_pairs
    main = rotor_view("magnets", rotation.magnet_exponents) + rotor_view(
        "current", np.repeat([-pair, pair], drive)
    )
    alone = 80.0 * rotor_view("suspension", np.repeat([-pair, pair], control))
    assert points > 2 * rotation.highest_order
    expected: dict[tuple[int, int], float] = {}
    for view in (main, alone):
        spectrum = np.fft.fft(view, axis=1) / instants
        for n in order:
            for k in range(1, instants // 2):
                square = sum(abs(spectrum[n - 1, i]) ** 2 for i in (k, instants - k))
                if square:
                    key = (int(n), k)
                    expected[key] = expected.get(key, 0.0) + square * (2.0 * n / radius) ** 2
    found: dict[tuple[int, int], float] = {}
    base = case.model.task.duty.speed / (2.0 * np.pi)
    for n, f, b in zip(seen["order"], seen["frequency"], seen["density"], strict=True):
        key = (int(n), round(float(f) / base))
        found[key] = found.get(key, 0.0) + float(b) ** 2
    scale = max(found.values())
    check(
        "squares of all waves that the rotor sees, by order and frequency, over the largest",
        [found.get(key, 0.0) / scale for key in expected],
        [value / scale for value in expected.values()],
        relative=1e-6,
        absolute=1e-12,
        why="rounding of the transform",
        source="Fourier transform of the field sampled on points that turn with the rotor",
    )
    assert abs(waves.phasor[0]) == pytest.approx(600.0)
