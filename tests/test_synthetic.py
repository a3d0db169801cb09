"""The tests' own simulator, held against closed forms and published values."""

from __future__ import annotations

import json
import subprocess
import sys

import numpy as np
import pytest
from synthetic import Current, Divider, Law, Logger, Network, Phase, Rig, noiseless, plunge

# A two-node sensor worked out by hand and by ODE apart from this project: Ce 0.5, Cs 2 J/K,
# 0.25 W/K between them, 0.5 W/K to the fluid. Computed values, not published ones.
TWO_NODES = Network((0.5, 2.0), (0.25,), 0.5)


def test_two_node_sensor_has_the_worked_values():
    truth = TWO_NODES.truth()
    assert truth["time_constants_s"] == pytest.approx([5.561553, 1.438447], abs=1e-6)
    assert truth["lag_s"] == pytest.approx(7.0, abs=1e-12)
    times = truth["response_time_s"]
    expected = [5.431141, 7.190495, 14.469528]
    assert [times["50"], times["63.2"], times["90"]] == pytest.approx(expected, abs=2e-6)
    assert TWO_NODES.response(5.0) == pytest.approx(0.46184730, abs=1e-8)
    assert 1 / TWO_NODES.dissipation_w_per_k() == pytest.approx(6.0, abs=1e-12)


def test_laws_give_the_tables_values():
    # Beta law, 10 kohm at 25 degC, 3950 K: recomputed values.
    beta = Law.beta(1e4, 25.0, 3950.0)
    assert beta.resistance([0.0, 50.0, 125.0]) == pytest.approx(
        [33620.6037, 3588.18258, 358.83388], rel=1e-8
    )
    # Steinhart-Hart check set a = 1.4e-3, b = 2.37e-4, c = 9.9e-8: published values.
    cubic = Law(1.4e-3, 2.37e-4, 9.9e-8)
    assert cubic.resistance([-10.0, 0.0, 50.0]) == pytest.approx(
        [17000.007273577, 10030.217595116, 1103.547410504], rel=1e-12
    )


def test_simulation_without_power_is_the_networks_own_response():
    times = np.linspace(0.0, 30.0, 61)
    rig = Rig(TWO_NODES, Law.beta(1e4, 25.0, 3950.0), Current(lambda _t: 0.0))
    element = rig.element_c(times, [Phase(0.0, 0.5, 20.0), Phase(10.0, 0.5, 60.0)])
    expected = [20 + 40 * TWO_NODES.response(max(t - 10.0, 0.0)) for t in times]
    assert element == pytest.approx(np.array(expected), abs=1e-6)


def test_steady_self_heating_balances_the_power():
    network, law, circuit = Network((0.01,), (), 0.001), Law.beta(1e4, 25.0, 3950.0), Divider()
    element = Rig(network, law, circuit).element_c(np.array([0.0, 500.0]), [Phase(0, 1e-3, 25.0)])
    power = circuit.power(law.resistance(element), 0.0)
    assert power == pytest.approx(0.001 * (element - 25.0), rel=1e-6)
    assert element[0] == pytest.approx(element[1], abs=1e-7)  # it begins settled
    assert 0.25 < element[0] - 25.0 < 0.28  # 3.3 V, matched: 0.272 mW over 1 mW/K


@pytest.mark.parametrize("sign", [1, -1])
def test_feedback_changes_the_small_signal_time_constant(sign):
    # tau / (1 + alpha theta) at constant current, theta the overheat, alpha = beta / T^2: closed
    # form by linearising the heat balance.
    beta_k, overheat, film = 3950.0, 2.0, 1e-3
    law = Law.beta(1e4, 25.0, beta_k)
    hot = 25.0 + overheat
    current = np.sqrt(film * overheat / float(law.resistance(hot)))
    rig = Rig(Network((0.01,), (), film), law, Current(lambda _t: current))
    phases = [Phase(0.0, film, 25.0), Phase(1.0, film, 25.0 + sign * 1e-3)]
    times = np.array([0.0, 1.0, 6.0, 400.0])
    start, _, at_five, final = rig.element_c(times, phases)
    tau = -5.0 / np.log((final - at_five) / (final - start))
    assert tau == pytest.approx(10.0 / (1 + beta_k / (hot + 273.15) ** 2 * overheat), rel=2e-3)


def test_converter_rounds_to_codes_and_stays_within_its_range():
    logger, rng = Logger(0.1, 1.0, noise_v=0.0), np.random.default_rng(1)
    volts = np.array([-0.1, 0.0, 1.65, 3.3, 3.4])
    assert logger.codes(volts, rng).tolist() == [0, 0, 2048, 4095, 4095]


def test_seed_decides_the_log():
    one, again, other = plunge(1), plunge(1), plunge(2)
    assert np.array_equal(one.codes, again.codes)
    assert not np.array_equal(one.codes, other.codes)
    assert np.all(np.diff(one.time_s) > 0)


def test_noise_is_the_loggers():
    log = plunge(3, logger=Logger(0.01, 60.0, noise_v=2e-3))
    quiet = plunge(3, logger=noiseless(log.logger), onset_s=log.onset_s)
    left = log.volts - quiet.volts
    expected = np.hypot(2e-3, 3.3 / 4095 / np.sqrt(12))
    assert left.std() == pytest.approx(expected, rel=0.03)  # 6000 samples: 0.9 % is one sigma


def test_samples_are_what_the_script_makes(project_root, tmp_path):
    folder = project_root / "sample_data"
    command = [sys.executable, str(folder / "make_samples.py"), str(tmp_path)]
    done = subprocess.run(command, capture_output=True, text=True)
    assert done.returncode == 0, done.stderr
    made = sorted(p.name for p in tmp_path.iterdir())
    kept = {p.name for p in folder.iterdir() if p.is_file()}
    assert kept == {*made, "README.md", "make_samples.py", "simulated_rig.py"}
    for name in made:
        old = (folder / name).read_text(encoding="utf-8").splitlines()
        new = (tmp_path / name).read_text(encoding="utf-8").splitlines()
        # another scipy may move a value across a converter's edge: a line or two, not more
        differing = sum(a != b for a, b in zip(old, new, strict=True))
        assert differing <= (2 if name.endswith(".csv") else 0), name


def test_known_answers_belong_to_the_logs(project_root):
    folder = project_root / "sample_data"
    known = json.loads((folder / "known_answers.json").read_text(encoding="utf-8"))["runs"]
    runs = {p.stem for p in folder.glob("*.toml")} - {"campaign"}
    assert set(known) == runs
    assert "nvented" in (folder / "README.md").read_text(encoding="utf-8")
    for name in runs:
        assert "# Invented data" in (folder / f"{name}.toml").read_text(encoding="utf-8")
