"""Gap fields of a batch at the duty: magnets, torque current, suspension current."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from evaluators.analytic.answers import Answers
from evaluators.analytic.gap import GapField
from evaluators.analytic.slots import SlotMouth
from evaluators.analytic.tips import ToothTips

ComplexArray = NDArray[np.complex128]


@dataclass(frozen=True)
class PerfectStator:
    """Gap fields of n designs under perfect teeth and yoke, with the rotor core as it is.

    `magnets` has one class per magnet order; the others have the Q residues of the slots. The
    suspension field is that of phasor one, per ampere-turn; `reaction` and `tip` are as of
    `evaluators.analytic.gap.SlottedGap.reaction` and `tip_reaction`.
    """

    magnets: GapField
    current: GapField
    suspension: GapField
    reaction: GapField
    tip: GapField
    answers: Answers


@dataclass(frozen=True)
class Waves:
    """Gap fields of n designs with iron of one permeability each for teeth and yoke.

    The suspension field is that of phasor one, per ampere-turn, and made with the small-signal
    iron; torque and magnet fields hold at the duty. `phasor` (n,) is that of the torque current.
    """

    magnets: GapField
    current: GapField
    suspension: GapField
    slot: SlotMouth
    tips: ToothTips
    phasor: ComplexArray
    perfect: PerfectStator
