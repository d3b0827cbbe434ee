"""What a model is best at: one minimised vector per phase, scaled, and its way back to the goal's unit."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from hubdesign.model.layout import Model
from hubdesign.problem import Phase

Floats = NDArray[np.float64]

#: Size that a large coefficient of a scaled objective has; solver tolerances are absolute.
_TYPICAL = 100.0


@dataclass(frozen=True, slots=True)
class Objective:
    """A linear objective to be minimised.

    Attributes
    ----------
    phase
        cost (minimised), profit or volume (maximised, so their negative is minimised).
    coefficients
        Scaled, shape (columns,).
    scale
        Goal's unit of one unit of the scaled objective; a power of two, so that nothing is rounded.
    offset
        Total O-D volume for the volume phase, else 0.
    """

    phase: Phase
    coefficients: Floats
    scale: float
    offset: float = 0.0

    @property
    def maximise(self) -> bool:
        """Whether a larger value in the goal's unit is better."""
        return self.phase != "cost"

    def value_of(self, scaled: float) -> float:
        """Return the value in the goal's unit of a scaled (minimised) objective."""
        return self.offset - scaled * self.scale if self.maximise else scaled * self.scale

    def scaled(self, value: float) -> float:
        """Return the scaled (minimised) objective of a value in the goal's unit."""
        return (self.offset - value) / self.scale if self.maximise else value / self.scale


def goal_phases(model: Model) -> tuple[Phase, ...]:
    """Return the phases of the goal: volume comes first and is then held at least cost.

    Today's network, where volume must not be left unserved, carries what it can first.
    """
    settings = model.network.problem.settings
    if settings.goal == "most-volume":
        return "volume", "cost"
    if settings.structure == "current" and not settings.unserved_allowed:
        return "volume", settings.objective_phase
    return (settings.objective_phase,)


def build_objective(model: Model, phase: Phase) -> Objective:
    """Return the objective of a phase."""
    expressions = model.program.expressions
    if phase == "volume":
        values, offset = expressions["unserved"], float(model.network.demand.volume.sum())
    elif phase == "profit":
        values, offset = expressions["cost"] - expressions["revenue"], 0.0
    else:
        values, offset = expressions["cost"], 0.0
    nonzero = np.abs(values[values != 0.0])
    size = float(np.quantile(nonzero, 0.9)) if len(nonzero) else _TYPICAL
    scale = float(2.0 ** np.round(np.log2(size / _TYPICAL)))
    return Objective(phase, values / scale, scale, offset)
