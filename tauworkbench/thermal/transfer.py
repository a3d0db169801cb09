r"""The transfer function between the medium and the sensor's internal temperature.

.. math:: H(s) = (1 + z s)\, e^{-\theta s} / \prod_i (1 + \tau_i s)

with time constants :math:`\tau_i` > 0 (the poles are minus their inverses), a zero's time
:math:`z` >= 0 (a direct path beside the slow one) and a dead time :math:`\\theta` >= 0, all in
seconds; unit gain. One pole, two poles, a zero and a dead time are this one record with other
numbers.

Use it for a sensor whose heat flows through a few lumps in a medium of constant film coefficient.
Not for a film coefficient that changes with temperature over the step (still air, boiling), nor,
with few poles, for the first tenth of a thick solid's response.
"""

from __future__ import annotations

from dataclasses import dataclass

from ..errors import InputError

__all__ = ["TransferFunction"]


@dataclass(frozen=True)
class TransferFunction:
    """Unit-gain transfer function; see the module for the formula.

    Attributes
    ----------
    time_constants_s : tuple of float
        Positive, from the slowest [s].
    zero_s : float
        [s]; 0 for none.
    dead_time_s : float
        [s]; 0 for none.
    """

    time_constants_s: tuple[float, ...]
    zero_s: float = 0.0
    dead_time_s: float = 0.0

    def __post_init__(self) -> None:
        taus = tuple(sorted((float(t) for t in self.time_constants_s), reverse=True))
        if not taus or not all(0 < t < float("inf") for t in taus):
            raise InputError(
                "time_constants_s", f"{taus} are not all positive and finite", "give seconds > 0"
            )
        for name in ("zero_s", "dead_time_s"):
            if not 0 <= getattr(self, name) < float("inf"):
                raise InputError(
                    name, f"{getattr(self, name)} is not zero or positive", "give seconds >= 0"
                )
        object.__setattr__(self, "time_constants_s", taus)

    @property
    def lag_s(self) -> float:
        """Lag behind a steady ramp [s]: sum of time constants minus zeros plus dead time."""
        return sum(self.time_constants_s) - self.zero_s + self.dead_time_s

    @property
    def model(self) -> str:
        """The name that ``result.json`` uses."""
        count = {1: "one-pole", 2: "two-pole"}
        poles = len(self.time_constants_s)
        words = count.get(poles, f"{poles}-pole")
        words += " with zero" if self.zero_s else ""
        return words + (" + dead time" if self.dead_time_s else "")
