"""From a log through circuit and law to the trace, and where it is refused."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from tauworkbench.errors import InputError
from tauworkbench.session.run import read_run, to_trace

TIME = np.arange(0.0, 10.0, 0.1)
OHM = np.linspace(9000.0, 11000.0, TIME.size)
LAW = "[law]\nkind = 'beta'\nresistance = 1e4\ntemperature_c = 25.0\nbeta_k = 3950.0\n"
KELVIN = 273.15
# The beta law, written out here: T = 1 / (1 / T0 + ln(R / R0) / B).
CELSIUS = 1 / (1 / (25.0 + KELVIN) + np.log(OHM / 1e4) / 3950.0) - KELVIN


def trace_of(
    folder: Path,
    columns: dict[str, np.ndarray],
    circuit: str,
    law: str = LAW,
    log: str = "",
    test: str = "",
):
    rows = np.stack([TIME, *columns.values()], axis=1)
    lines = [",".join(["t [s]", *columns]), *(",".join(f"{x:.9g}" for x in r) for r in rows)]
    (folder / "log.csv").write_text("\n".join(lines) + "\n")
    (folder / "run.toml").write_text(
        f"[log]\nfile = 'log.csv'\ntime = 't'\nsignal = 'y'\n{log}\n"
        f"[circuit]\n{circuit}\n{law}\n[test]\nkind = 'plunge'\n{test}\n"
    )
    return to_trace(read_run(folder / "run.toml"))


def divider_volts(supply):
    return supply * OHM / (OHM + 1e4)


DIVIDER = "kind = 'divider'\nfixed = 1e4\nsensor_leg = 'low'\nsupply = "


def test_ohms_through_the_law(tmp_path):
    trace = trace_of(tmp_path, {"y [kOhm]": OHM / 1000}, "kind = 'ohms'")
    np.testing.assert_allclose(trace.temperature_c, CELSIUS, atol=1e-5)


def test_a_divider_with_a_logged_supply(tmp_path):
    supply = np.linspace(3.0, 3.6, TIME.size)
    columns = {"y [mV]": 1e3 * divider_volts(supply), "vs [V]": supply}
    trace = trace_of(tmp_path, columns, DIVIDER + "'vs'")
    np.testing.assert_allclose(trace.temperature_c, CELSIUS, atol=1e-4)


def test_noise_is_given_in_the_signals_unit(tmp_path):
    columns = {"y [mV]": 1e3 * divider_volts(3.3)}
    given = trace_of(tmp_path, columns, DIVIDER + "3.3", log="noise_u = 0.2")
    slope = np.gradient(CELSIUS, divider_volts(3.3))
    np.testing.assert_allclose(given.sigma_k[1:-1], 0.2e-3 * np.abs(slope[1:-1]), rtol=1e-3)


def test_noise_in_fahrenheit_is_a_difference(tmp_path):
    columns = {"y [degF]": CELSIUS * 1.8 + 32}
    trace = trace_of(tmp_path, columns, "kind = 'thermometer'", law="", log="noise_u = 0.18")
    np.testing.assert_allclose(trace.temperature_c, CELSIUS, atol=1e-5)
    np.testing.assert_allclose(trace.sigma_k, 0.1)


def test_what_the_reader_does_goes_along(tmp_path):
    law = LAW + "[reference]\ncolumn = 'bath'\ntime_constant_s = 0.3\ndelay_s = -0.2\n"
    columns = {"y [ohm]": OHM, "bath [K]": CELSIUS + KELVIN}
    log = "averaging_s = 0.1\nfilter_s = 0.05"
    trace = trace_of(tmp_path, columns, "kind = 'ohms'", law, log)
    reader = trace.reader
    assert (reader.averaging_s, reader.filter_s) == (0.1, 0.05)
    assert (reader.reference_time_constant_s, reader.reference_delay_s) == (0.3, -0.2)
    np.testing.assert_allclose(trace.reference_c, CELSIUS, atol=1e-5)


def test_an_electrical_reference_has_its_own_circuit_and_law(tmp_path):
    platinum = 100 * (1 + 3.9083e-3 * CELSIUS - 5.775e-7 * CELSIUS**2)  # IEC 60751, above 0 degC
    law = LAW + (
        "[reference]\ncolumn = 'pt'\ncircuit = { kind = 'current', current = 1e-3 }\n"
        "law = { kind = 'platinum' }\n"
    )
    trace = trace_of(tmp_path, {"y [ohm]": OHM, "pt [V]": platinum * 1e-3}, "kind = 'ohms'", law)
    np.testing.assert_allclose(trace.reference_c, CELSIUS, atol=1e-4)


@pytest.mark.parametrize(
    "law", ["kind = 'table'\nfile = 'rt.csv'", "kind = 'beta'\npoints = 'rt.csv'"]
)
def test_a_law_from_a_file_of_points(tmp_path, law):
    points = "\n".join(f"{t:.6f},{r:.6f}" for t, r in zip(CELSIUS, OHM, strict=True))
    (tmp_path / "rt.csv").write_text(f"temperature_c,resistance_ohm\n{points}\n")
    trace = trace_of(tmp_path, {"y [ohm]": OHM}, "kind = 'ohms'", f"[law]\n{law}\n")
    np.testing.assert_allclose(trace.temperature_c, CELSIUS, atol=1e-4)


def refused(folder, where, words, **kwargs):
    with pytest.raises(InputError) as e:
        trace_of(folder, **{"columns": {"y [ohm]": OHM}, "circuit": "kind = 'ohms'", **kwargs})
    assert e.value.where == str(folder / "run.toml") + " " + where
    assert words in str(e.value)


def test_a_unit_of_another_kind_is_refused(tmp_path):
    refused(tmp_path, "[log] signal", "is in V", columns={"y [V]": OHM})


def test_a_column_that_is_not_there_is_refused(tmp_path):
    refused(tmp_path, "[log] signal", 'did you mean "y1"?', columns={"y1 [ohm]": OHM})


def test_a_supply_column_that_is_not_there_is_refused(tmp_path):
    circuit = DIVIDER + "'vsupply'"
    refused(tmp_path, "[circuit] supply", "vsupply", columns={"y [V]": OHM}, circuit=circuit)


def test_a_circuits_own_refusal_is_put_at_its_table(tmp_path):
    circuit = "kind = 'current'\ncurrent = 1e-3\ncounts = { bits = 12, reference = 'supply' }"
    refused(
        tmp_path, "[circuit] counts.reference", "has none",
        columns={"y [counts]": OHM}, circuit=circuit,
    )  # fmt: skip


def test_a_references_refusal_is_put_at_its_table(tmp_path):
    law = LAW + (
        "[reference]\ncolumn = 2\n"
        "circuit = { kind = 'current', current = 1, counts = { bits = 9, reference = 'supply' } }\n"
        "law = { kind = 'platinum' }\n"
    )
    refused(tmp_path, "[reference] circuit counts.reference", "has none", law=law)


def test_a_laws_own_refusal_is_put_at_its_table(tmp_path):
    law = LAW.replace("1e4", "1e4\nbeta_rel_u = 1.0")
    refused(tmp_path, "[law] beta_rel_u", "1", law=law)


def test_a_table_of_points_that_is_not_there_is_refused(tmp_path):
    with pytest.raises(InputError) as e:
        trace_of(tmp_path, {"y [ohm]": OHM}, "kind = 'ohms'", "[law]\nkind='table'\nfile='no.csv'")
    assert e.value.where == str(tmp_path / "no.csv")


def test_points_that_are_no_numbers_are_refused(tmp_path):
    (tmp_path / "rt.csv").write_text("temperature_c,resistance_ohm\n20,1000\n30,x\n40,800\n")
    with pytest.raises(InputError, match="resistance_ohm"):
        trace_of(tmp_path, {"y [ohm]": OHM}, "kind = 'ohms'", "[law]\nkind='table'\nfile='rt.csv'")


def test_the_measuring_currents_own_heating_is_said(tmp_path):
    circuit, test = "kind = 'current'\ncurrent = 1e-4", "dissipation_mw_per_k = 2.0"
    trace = trace_of(tmp_path, {"y [V]": OHM * 1e-4}, circuit, test=test)
    # I^2 R = 1e-8 A^2 * 9 to 11 kohm = 0.09 to 0.11 mW, over 2 mW/K
    assert any("0.045 to 0.055 K at 2 mW/K" in c for c in trace.cautions)
