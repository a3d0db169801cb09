r"""Pass, fail or undecided: a mean against an upper limit, with the measurement uncertainty in it.

JCGM 106:2012. With the estimate :math:`y`, its standard uncertainty :math:`u` and the limit
:math:`T`, the probability that the truth conforms is :math:`\Phi((T - y) / u)`. *Pass* when it is
at least 1 - risk, *fail* when it is at most the risk, else *undecided*. The same in lengths: the
estimate must lie on its side of the limit by a guard band, the one-sided quantile times u.
Student's t takes the place of the normal distribution where u has few degrees of freedom.
"""

from __future__ import annotations

from dataclasses import dataclass

from scipy.stats import t as student

__all__ = ["Decision", "Side", "decide"]


@dataclass(frozen=True)
class Side:
    """Uncertainty of a mean towards one side; the sides differ where an effect has one sign.

    Attributes
    ----------
    standard_uncertainty, degrees_of_freedom : float
        The latter may be infinite.
    """

    standard_uncertainty: float
    degrees_of_freedom: float = float("inf")

    def band(self, probability: float) -> float:
        """How far the truth lies on this side at most, with that one-sided probability."""
        if not self.standard_uncertainty:
            return 0.0
        return float(student.ppf(probability, self.degrees_of_freedom)) * self.standard_uncertainty


@dataclass(frozen=True)
class Decision:
    """A decision on one mean.

    Attributes
    ----------
    decision : str
        ``pass``, ``fail`` or ``undecided``.
    limit : float
        Upper limit, in the mean's unit.
    risk : float
        Greatest accepted probability that a pass or a fail is wrong.
    conformance_probability : float
        Of the truth being at or below the limit.
    pass_below, fail_above : float
        Acceptance and rejection limits: the limit less and plus its guard band.
    """

    decision: str
    limit: float
    risk: float
    conformance_probability: float
    pass_below: float
    fail_above: float


def decide(mean: float, below: Side, above: Side, limit: float, risk: float) -> Decision:
    """Hold a mean against an upper limit; see the module.

    Parameters
    ----------
    mean : float
    below, above : Side
        Its uncertainty towards lower and towards higher values.
    limit : float
    risk : float
        Between 0 and 0.5.
    """
    accept, reject = limit - above.band(1 - risk), limit + below.band(1 - risk)
    word = "pass" if mean <= accept else "fail" if mean >= reject else "undecided"
    # what could carry the truth across the limit is the uncertainty on the limit's side
    side = above if mean <= limit else below
    distance, u = limit - mean, side.standard_uncertainty
    conforms = 1.0 if distance >= 0 else 0.0
    if u > 0:
        conforms = float(student.cdf(distance / u, side.degrees_of_freedom))
    return Decision(word, limit, risk, conforms, accept, reject)
