"""What passes between the core and life models: what a part went through, and what that consumes of its life.

Shapes: (N,) cycles, (S,) steps. SI units, temperatures in degC, differences in K.
"""

from __future__ import annotations

from typing import Any, Literal, NamedTuple, Protocol, runtime_checkable

import numpy as np
from numpy.typing import NDArray
from pydantic import BaseModel

from tideleg.waveform import FloatArray

WornKind = Literal["switch", "inductor", "capacitor", "stage"]
"""What a life model reads: a sort of part, or the stage as a whole for what merely runs along, such as a fan."""


class Cycles(NamedTuple):
    """Cycles of temperature, arrays (N,).

    minimum, maximum : [degC]
    begin, end : time of the two turning points that bound the swing, in their order [s]
    weight : 1 for a whole cycle, 0.5 for a half [-]
    """

    minimum: FloatArray
    maximum: FloatArray
    begin: FloatArray
    end: FloatArray
    weight: FloatArray

    @property
    def range(self) -> FloatArray:
        """Swing from minimum to maximum [K]."""
        return self.maximum - self.minimum

    @property
    def mean(self) -> FloatArray:
        """Middle of minimum and maximum [degC]."""
        return 0.5 * (self.minimum + self.maximum)

    @property
    def heating_time(self) -> FloatArray:
        """Time between the two turning points [s].

        Of a cycle that begins with its fall, the rise that closes it is taken to last as long as the fall.
        """
        return self.end - self.begin


class Stress(NamedTuple):
    """What one part goes through in one pass of a mission.

    cycles : of its temperature
    temperature : mean over each step (S,) [degC]
    duration : of each step (S,) [s]
    current : rms of one part (S,) [A]
    voltage : across it: blocked by a switch, on a capacitor's port (S,) [V]
    active : 1 where the stage switches, 0 where it idles (S,) [-]

    Without a thermal path there are no cycles and no temperature: both are empty.
    """

    cycles: Cycles
    temperature: FloatArray
    duration: FloatArray
    current: FloatArray
    voltage: FloatArray
    active: FloatArray


class Consumption(NamedTuple):
    """Shares of a life, by cycle (N,) or by step (S,) as the term says.

    damage : n/N of each cycle, its count included, or time over life of each step [-]
    outside : whether it lies outside the data that the model stands on
    """

    damage: FloatArray
    outside: NDArray[np.bool_]


class LifeTerm(Protocol):
    """One way to wear out, with its data bound."""

    @property
    def mechanism(self) -> str:
        """What wears, such as "bond wires and chip solder"."""
        ...

    @property
    def reads(self) -> Literal["cycles", "steps"]:
        """Whether `consumed` answers by cycle or by step."""
        ...

    @property
    def spread(self) -> float:
        """Standard deviation of the natural logarithm of life between equal parts [-]."""
        ...

    @property
    def box(self) -> str:
        """Where its data hold, in words, such as "swing 30 to 80 K, mean 60 to 100 degC"."""
        ...

    def consumed(self, stress: Stress) -> Consumption:
        """Return the damage of the median part; what lies outside the data counts as well and is marked."""
        ...


@runtime_checkable
class LifeModel(Protocol):
    """A life model: reads what a part went through and says how much of its life that took."""

    @property
    def name(self) -> str:
        """Name that a plan gives in [life.<part>] model."""
        ...

    @property
    def source(self) -> str:
        """Where its formula comes from."""
        ...

    @property
    def reads(self) -> WornKind:
        """The kind of part it reads."""
        ...

    @property
    def settings(self) -> type[BaseModel]:
        """Model of the keys it reads in [life.<part>]."""
        ...

    def term(self, settings: Any) -> LifeTerm:
        """Return the model with its data bound."""
        ...
