r"""What drives a sensor besides an ideal step: a finite transfer, and the reader's own filter.

A change of medium that takes a time d (a linear ramp) and a reader that averages over a time a
are both running means, applied to the response: with :math:`R` the integral of :math:`r`,
:math:`\bar r(t) = [R(t) - R(t - d)] / d`. A first-order filter in the reader is one more lag.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from ..records import FloatArray
from .plain import plain_step
from .responses import Shape, shape_integral, shape_slopes

__all__ = ["Drive"]


@dataclass(frozen=True)
class Drive:
    """The chain beside the sensor.

    Attributes
    ----------
    means_s : tuple of float
        Lengths of running means [s]: the transfer's, the reader's averaging.
    filter_rates : tuple of float
        Rates of first-order filters in the reader [1/s].
    """

    means_s: tuple[float, ...] = ()
    filter_rates: tuple[float, ...] = ()

    def step(self, shape: Shape, time_s: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Step answer, its time derivative and its slopes, as `plain.plain_step` gives them."""
        if not self.means_s and not self.filter_rates:
            return plain_step(shape, time_s)
        return (
            self.integral(1, shape, time_s),
            self.integral(0, shape, time_s),
            self.slopes(1, shape, time_s),
        )

    def integral(self, k: int, shape: Shape, time_s: FloatArray) -> FloatArray:
        """`shape_integral` through this chain, shape (n,)."""

        def plain(order: int, time: FloatArray) -> FloatArray:
            return shape_integral(order, shape, time, self.filter_rates)

        return _mean(plain, k, time_s, self.means_s)

    def slopes(self, k: int, shape: Shape, time_s: FloatArray) -> FloatArray:
        """`shape_slopes` through this chain, shape (numbers of the shape, n)."""

        def plain(order: int, time: FloatArray) -> FloatArray:
            return np.array(shape_slopes(order, shape, time, self.filter_rates))

        return _mean(plain, k, time_s, self.means_s)


def _mean(
    function: Callable[[int, FloatArray], FloatArray],
    k: int,
    time: FloatArray,
    means: tuple[float, ...],
) -> FloatArray:
    """Apply running means by going one integral up for each."""
    if not means:
        return function(k, time)
    length, rest = means[0], means[1:]
    late = _mean(function, k + 1, time, rest)
    return (late - _mean(function, k + 1, time - length, rest)) / length
