"""From the field of one slice to the metrics of the whole machine, the same for all evaluators.

The stack is as long as the duty's torque needs, the coils have as many whole turns as the DC link
allows, and winding, magnets and gas have the temperatures that the losses bring about; masses,
stresses, bending speeds, levitation and cost follow.
"""

from evaluators.machine.performance.machine import Performance, performance

__all__ = ["Performance", "performance"]
