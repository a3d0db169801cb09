"""Results as a campaign gets them, from the few numbers that matter here."""

from __future__ import annotations

import math

from tauworkbench.campaign.records import CampaignRun
from tauworkbench.records import (
    Budget,
    BudgetLine,
    Combined,
    FitSummary,
    NoiseSummary,
    StepSummary,
)
from tauworkbench.result import Provenance, RunInfo
from tauworkbench.session.saved import SavedResult
from tauworkbench.uncertainty import Quantity


def quantity(value, u=None):
    return Quantity(value) if u is None else Quantity.wald(value, u, 1.96)


def result(t63=2.0, u=0.01, *, lag=None, taus=None, lines=(), heating=True, number=1, **run):
    """One fitted step; ``lines`` are budget lines beside the noise; ``run`` as in `RunInfo`."""
    taus = taus or (t63,)
    lag = sum(taus) if lag is None else lag
    info = {"name": "r", "test": "plunge", "quantity": "ambient-change", "sensor": "P1",
            "medium": "water", "speed_m_s": 0.4, **run}  # fmt: skip
    levels = (20.0, 60.0) if heating else (60.0, 20.0)
    total = math.hypot(u or 0.0, *(x.standard_uncertainty for x in lines))
    budget = None
    if u is not None:
        all_lines = (BudgetLine("signal noise", u), *lines)
        combined = Combined(total, 1.96, t63 - 1.96 * total, t63 + 1.96 * total)
        budget = Budget("response_time_s.63.2", all_lines, combined)
    return SavedResult(
        run=RunInfo(**info),
        step=StepSummary("found", quantity(levels[1], 0.01), (0.0, 90.0), quantity(10.0, 0.01),
                         quantity(levels[0], 0.01), number),
        fit=FitSummary(
            "two-pole" if len(taus) > 1 else "one-pole",
            tuple(quantity(t, u) for t in taus),
            {},
            {"50": quantity(0.69 * t63, u), "63.2": quantity(t63, u), "90": quantity(2.3 * t63, u)},
            quantity(lag, u),
            NoiseSummary("white", 0.02, 0.0, 1000, 1000.0),
            (),
            True,
        ),
        provenance=Provenance("0" * 64, "", {}),
        budget=budget,
    )  # fmt: skip


def runs(*results):
    """A campaign's runs, one result each."""
    return tuple(CampaignRun(f"run_{i}", (r,)) for i, r in enumerate(results))
