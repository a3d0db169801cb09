"""What a tolerance does to the ohms, against derivatives by hand."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from tauworkbench.circuits import Bridge, CurrentSource, Divider, Ohms

OHMS = np.array([1e3, 1e4, 1e5])
LOW: dict[str, Any] = {"supply": 3.3, "fixed": 1e4, "sensor_leg": "low"}
U = 1e-4


def _shifts(circuit):
    return dict(circuit.shifts(circuit.signal(OHMS)))


@pytest.mark.parametrize("leg", ["low", "high"])
def test_fixed_resistor_scales_the_ohms(leg):
    shifts = _shifts(Divider(**{**LOW, "sensor_leg": leg}, fixed_rel_u=U))
    np.testing.assert_allclose(shifts["fixed resistor"], U * OHMS, rtol=1e-9)


def test_supply_of_a_divider():
    # R = F v / (S - v): dR / dln S = -R S / (S - v) = -R (R + F) / F; and the other leg's opposite
    expected = U * OHMS * (OHMS + 1e4)
    low = _shifts(Divider(**LOW, supply_rel_u=U))["supply voltage"]
    np.testing.assert_allclose(low, -expected / 1e4, rtol=2e-3)
    high = _shifts(Divider(**{**LOW, "sensor_leg": "high"}, supply_rel_u=U))["supply voltage"]
    np.testing.assert_allclose(high, U * (OHMS + 1e4), rtol=1e-9)


def test_supply_cancels_where_it_is_the_reference():
    counts = {"bits": 12, "reference": "supply"}
    assert _shifts(Divider(**LOW, supply_rel_u=0.01, counts=counts)) == {}
    assert (
        list(_shifts(Bridge(**LOW, upper=1e4, lower=5e3, supply_rel_u=0.01, counts=counts))) == []
    )


def test_supply_of_a_bridge_does_nothing_at_balance():
    bridge = Bridge(**LOW, upper=1e4, lower=1e4, supply_rel_u=0.01)
    shift = dict(bridge.shifts(bridge.signal(OHMS)))["supply voltage"]
    assert abs(shift[1]) < 1e-6
    assert abs(shift[2]) > 100.0


def test_current_scales_the_ohms():
    shifts = _shifts(CurrentSource(current=1e-5, current_rel_u=U))
    np.testing.assert_allclose(shifts["measuring current"], -U / (1 + U) * OHMS, rtol=1e-9)


def test_nothing_stated_nothing_given():
    for circuit in (Divider(**LOW), Divider(**LOW, fixed_rel_u=0.0), Ohms()):
        assert circuit.shifts([1.0]) == ()
