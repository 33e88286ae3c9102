"""Without slots and with perfect iron the fields, forces and stiffness are known in closed form."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from outside import OutsideChecks

from evaluators.finite_element.outcome import stress
from evaluators.finite_element.outcome.displacement import stiffness
from evaluators.finite_element.solution.batch import BatchField, Solution
from evaluators.finite_element.solution.lanes import LANES

SlotlessMaker = Callable[..., BatchField]
NO_CURRENT = np.zeros(LANES)

check_field, check_force = OutsideChecks("field"), OutsideChecks("force")

# Radial flux density at the bore, T: amplitude of each order. Rr, Rm, Rs = 20, 24, 25 mm, p = 2,
# and 10, 18, 20 mm, p = 1; arc 0.8, mu_r 1.05, Br 1.2 T.
BORE_FIELD = {
    ("radial", 2): {2: 1.0219770, 6: 0.19538660, 14: 0.064130039, 18: 0.069260756},
    ("parallel", 2): {2: 1.0262970, 6: 0.066337260, 10: 0.087402510, 14: 0.10418244},
    ("radial", 1): {1: 0.82039957, 3: 0.15322277, 7: 0.047538747},
}
MACHINE = {2: ((12, 2, 1), 20.0, 24.0, 25.0), 1: ((12, 1, 2), 10.0, 18.0, 20.0)}


def no_load(batch: BatchField, angle: float = 0.0) -> Solution:
    return batch.solve_torque(np.array([angle]), NO_CURRENT)


@pytest.mark.parametrize(("magnetisation", "p"), BORE_FIELD)
def test_magnet_field_at_the_bore(
    slotless_machine: SlotlessMaker, magnetisation: str, p: int
) -> None:
    numbers, core, magnet, bore = MACHINE[p]
    batch = slotless_machine(numbers, core, magnet, bore, magnetisation=magnetisation)
    waves = no_load(batch).waves
    for order, expected in BORE_FIELD[magnetisation, p].items():
        place = int(np.searchsorted(waves.orders, order))
        found = 2.0 * order * np.abs(waves.potential[0, place]) / batch.sections.bore_radius
        main = order == p
        check_field(
            f"{'main order' if main else 'higher orders'} of the magnets' field at a slotless bore",
            found,
            expected,
            relative=1e-5 if main else 1e-2,
            why="only the trace on the bore is discretised: on coarse meshes 1e-5 (n = p) to 1 % "
            "(n = 9 p)",
            source="closed form of Zhu, Howe, Chan, IEEE Trans. Magn. 38(1), 2002, by a "
            "four-region boundary-value solution of its own",
        )


def test_error_falls_with_refinement(slotless_machine: SlotlessMaker) -> None:
    numbers, core, magnet, bore = MACHINE[2]
    errors = []
    for refinement in (1, 2):
        batch = slotless_machine(numbers, core, magnet, bore, refinement=refinement)
        waves = no_load(batch, 0.1).waves
        place = int(np.searchsorted(waves.orders, 18))
        found = 36.0 * np.abs(waves.potential[0, place, 0]) / batch.sections.bore_radius[0]
        errors.append(abs(found - 0.069260756))
    check_field.within(
        "fall of the error of the ninth order when the mesh is halved",
        errors[0] / errors[1],
        2**3,
        np.inf,
        why="a rate that is better does no harm",
        source="quadratic elements: at least h^3 (theory of finite elements)",
    )


def test_hardly_any_torque_at_no_load(slotless_machine: SlotlessMaker) -> None:
    batch = slotless_machine(*MACHINE[2])
    waves = batch.solve_torque(np.array([0.0, 0.05, 0.1]), NO_CURRENT).waves
    torque = stress.torque(waves.orders, waves.potential, waves.tangential)
    check_force(
        "torque of a slotless machine without current over that of a sheet of 20 kA/m",
        torque / 40.0,
        0.0,
        absolute=1e-3,
        why="the mesh's own slot pitch makes 6e-4 (measured), from orders that it resolves by a "
        "few elements",
        source="symmetry: none",
    )


# Aligned current sheet of 10 kA/m on the bore, N/m.
FORCE = {((12, 1, 2), 2): 1382.586, ((12, 2, 1), 1): 1440.442, ((12, 2, 1), 3): 1098.112}


@pytest.mark.parametrize(("numbers", "nu"), FORCE)
def test_force_of_a_current_sheet(
    slotless_machine: SlotlessMaker, numbers: tuple[int, int, int], nu: int
) -> None:
    batch = slotless_machine(numbers, 20.0, 24.0, 25.0, recoil=1.0, fundamental_only=True)
    model, radius = batch.model, batch.sections.bore_radius
    main = no_load(batch)
    sector, topology = model.symmetry.suspension, model.suspension
    orders = np.array([nu])
    sheet = (-radius * 1e4 / 2.0j)[None, :]  # K sin(nu phi), whose radial field is a cosine
    load = np.zeros((topology.size, LANES))
    load[topology.lattice.bore] = batch.gap.source_load(
        sheet, orders, -model.pitch * np.arange(sector.slots)
    )
    small = batch.perturb(batch.equations(topology), main.nodes, [(load, np.zeros_like(load))])
    answer = batch.gap.coefficients(small[:, topology.lattice.bore].real, sector, orders)
    highest = batch.highest_wave
    fields = [
        stress.rotating(stress.spread(rows, a, highest), stress.spread(rows, h, highest), radius)
        for rows, a, h in (
            (main.waves.orders, main.waves.potential, main.waves.tangential),
            (orders, answer, batch.response[orders] * answer),
        )
    ]
    force = 2.0 * stress.pair(fields[0], fields[1], radius)
    check_force(
        "force of a current sheet in a slotless machine",
        np.abs(force[0]),
        FORCE[numbers, nu],
        relative=1e-4,
        why="only the orders' own traces on the bore are discretised: 1e-5 on coarse meshes",
        source="pi Rs B1 K/2 (coth(nu ln(Rs/Rr)) ± 1), exact with curvature (own derivation; "
        "Bichsel, dissertation, ETH Zurich 1990, from memory)",
    )
    assert np.max(np.abs(force.imag)) < 1e-6 * np.max(np.abs(force))


# N/m per m, p = 1 without homopolar path. B1 = 1.039318 T (p = 1), 1.031641 T (p = 2) at the bore.
STIFFNESS = {(12, 1, 2): 4_573_941.0, (12, 2, 1): 7_774_065.0}


@pytest.mark.parametrize("numbers", STIFFNESS)
def test_stiffness_of_concentric_cylinders(
    slotless_machine: SlotlessMaker, numbers: tuple[int, int, int]
) -> None:
    batch = slotless_machine(numbers, 20.0, 24.0, 25.0, recoil=1.0, fundamental_only=True)
    equations = batch.equations(batch.model.suspension)
    found = stiffness(batch, no_load(batch, 0.2), [0], equations)
    check_force(
        "stiffness of a displaced slotless rotor",
        found[0],
        STIFFNESS[numbers],
        relative=1e-4,
        why="only traces on the bore are discretised: 1e-5 on coarse meshes",
        source="pi B1²/(4 mu0) ((p+1)(coth((p+1)x) + 1) + (p-1)(coth((p-1)x) - 1)), "
        "x = ln(Rs/Rr) (own derivation, confirmed to 1e-5 with scikit-fem on eccentric meshes)",
    )
