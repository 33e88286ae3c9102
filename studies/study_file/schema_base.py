"""What all sections of a study file share."""

from __future__ import annotations

from pydantic import BaseModel, ConfigDict

MEGA, KILO, MILLI, MICRO = 1e6, 1e3, 1e-3, 1e-6


class Section(BaseModel):
    """A table of the study file: no unknown keys, no text for numbers."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True)
