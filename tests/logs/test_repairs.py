"""What is mended or noted on the time base: counted, placed, and nothing else touched."""

from __future__ import annotations

import numpy as np
import pytest

from tauworkbench.logs import read_log, repairs, to_channels

N = 400


def plunge(n=N, noise=0.002, seed=0, tau=15):
    """A step answered by one pole, in V, sampled every 0.1 s; the step is at sample 100."""
    i = np.arange(n)
    clean = np.where(i < 100, 1.0, 2.0 - np.exp(-np.maximum(i - 100.0, 0.0) / tau))
    return np.round(clean + noise * np.random.default_rng(seed).standard_normal(n), 4)


def channels(tmp_path, time, volts, *more, **roles):
    path = tmp_path / "log.csv"
    columns = [f"c{i}" for i in range(len(more))]
    lines = [",".join(["t [s]", "v [V]", *(f"{c} [V]" for c in columns)])]
    cells = [[f"{x:.10g}" if np.isfinite(x) else "" for x in c] for c in (time, volts, *more)]
    lines += [",".join(row) for row in zip(*cells, strict=True)]
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    return to_channels(read_log(path), {"time": "t", "signal": "v", **roles}, {})


def kinds(found):
    return {r.kind: r.count for r in found.repairs}


def test_clean_log_is_untouched(tmp_path):
    time, volts = np.arange(N) * 0.1, plunge()
    found = channels(tmp_path, time, volts)
    np.testing.assert_allclose(found.time_s, time, atol=1e-9)
    np.testing.assert_array_equal(found.values["signal"], volts)
    np.testing.assert_array_equal(found.rows, np.arange(2, N + 2))
    assert found.repairs == found.cautions == ()


def test_duplicates_are_averaged(tmp_path):
    time, volts = np.arange(N) * 0.1, plunge()
    time[51], time[52] = time[50], time[50]
    found = channels(tmp_path, time, volts)
    assert kinds(found) == {"duplicates": 2}
    assert found.values["signal"][50] == pytest.approx(volts[50:53].mean())
    assert f"differ by up to {np.ptp(volts[50:53]):.4g}" in found.cautions[0]
    assert found.repairs[0].times_s == pytest.approx([5.0])


def test_out_of_order_rows_are_sorted(tmp_path):
    time, volts = np.arange(N) * 0.1, plunge()
    order = np.arange(N)
    order[200:203] = [202, 200, 201]
    found = channels(tmp_path, time[order], volts[order])
    np.testing.assert_array_equal(found.values["signal"], volts)
    assert kinds(found) == {"out of order": 2}
    assert list(found.rows[200:203] - 2) == [201, 202, 200]


def test_log_time_starts_at_the_earliest_stamp(tmp_path):
    time = np.arange(N) * 0.1
    time[-1] = -5.0
    found = channels(tmp_path, time + 100, plunge())
    assert found.time_s[0] == 0.0
    assert found.time_origin == '95 s in "t"'


def test_earliest_stamp_counts_though_its_row_has_no_signal(tmp_path):
    volts = plunge()
    volts[:3] = np.nan
    found = channels(tmp_path, np.arange(N) * 0.1, volts)
    assert found.time_s[0] == pytest.approx(0.3)
    assert kinds(found) == {"missing samples": 3}


def test_gap_is_noted(tmp_path):
    time = np.arange(N) * 0.1
    time[300:] += 7.0
    found = channels(tmp_path, time, plunge())
    assert kinds(found) == {"gaps": 1}
    assert "of 7.1 s at 29.9 s" in found.cautions[0]
    assert found.time_s.size == N


def test_jitter_is_no_gap(tmp_path):
    time = np.arange(N) * 0.1 + 0.09 * np.random.default_rng(1).random(N)
    assert channels(tmp_path, time, plunge()).repairs == ()


def test_stall_and_burst_is_noted(tmp_path):
    time = np.arange(N) * 0.1
    time[200:230] = time[230] - 0.002 * np.arange(30, 0, -1)
    found = channels(tmp_path, time, plunge())
    assert kinds(found) == {"stall": 31}
    assert "when they were written" in found.cautions[0]
    assert found.time_s.size == N


def test_spikes_are_set_aside_and_kept_for_the_plot(tmp_path):
    time, volts = np.arange(N) * 0.1, plunge()
    spiked = volts.copy()
    spiked[[30, 120, 350]] += [0.8, -0.5, 3.0]
    found = channels(tmp_path, time, spiked)
    assert kinds(found) == {"spikes": 3}
    np.testing.assert_allclose(found.repairs[0].times_s, [3.0, 12.0, 35.0])
    np.testing.assert_allclose(found.repairs[0].values, spiked[[30, 120, 350]])
    np.testing.assert_array_equal(found.values["signal"], np.delete(volts, [30, 120, 350]))


@pytest.mark.parametrize("tau", [0.05, 0.3, 1.0, 3.0])
@pytest.mark.parametrize("noise", [0.0, 1e-4, 0.01])
def test_fast_response_has_no_spikes(tau, noise):
    for seed in range(20):
        assert not repairs.spikes(plunge(noise=noise, seed=seed, tau=tau)).any()


def test_noise_alone_has_no_spikes():
    generator = np.random.default_rng(3)
    assert not any(repairs.spikes(generator.standard_normal(20_000)).any() for _ in range(5))
    coarse = np.round(generator.standard_normal(20_000) * 0.3)
    assert not repairs.spikes(coarse).any()


def test_a_pulse_of_two_samples_is_no_spike():
    volts = plunge()
    volts[30:32] += 0.8
    assert not repairs.spikes(volts).any()


def test_noise_that_grows_with_the_level_has_no_spikes():
    generator = np.random.default_rng(4)
    level = np.where(np.arange(2000) < 1800, 1e-4, 1e-2)
    assert not repairs.spikes(level * generator.standard_normal(2000)).any()


def test_stuck_values_are_noted(tmp_path):
    volts = plunge(noise=0.01)
    volts[250:290] = volts[250]
    found = channels(tmp_path, np.arange(N) * 0.1, volts)
    assert kinds(found) == {"stuck": 40}
    assert found.time_s.size == N


def test_rail_is_noted(tmp_path):
    volts = np.minimum(plunge(noise=0.01), 1.8)
    found = channels(tmp_path, np.arange(N) * 0.1, volts)
    assert set(kinds(found)) == {"rail"}


def test_quantised_plateau_is_not_stuck(tmp_path):
    volts = np.round(plunge(noise=0.0), 2)
    assert channels(tmp_path, np.arange(N) * 0.1, volts).repairs == ()


def test_supply_holds_until_its_next_stamp(tmp_path):
    supply = np.full(N, np.nan)
    supply[[2, 100, 300]] = [3.3, 3.2, 3.4]
    found = channels(tmp_path, np.arange(N) * 0.1, plunge(), supply, supply="c0")
    expected = np.r_[np.full(100, 3.3), np.full(200, 3.2), np.full(100, 3.4)]
    np.testing.assert_array_equal(found.values["supply"], expected)
    assert found.repairs == ()


def test_absent_reference_is_drawn_and_counted(tmp_path):
    reference = np.linspace(20, 60, N)
    holes = reference.copy()
    holes[np.arange(N) % 4 != 0] = np.nan
    found = channels(tmp_path, np.arange(N) * 0.1, plunge(), holes, reference="c0")
    assert kinds(found) == {"drawn through": 300}
    np.testing.assert_allclose(found.values["reference"][:-4], reference[:-4])


def test_slowly_polled_reference_runs_straight_between_its_updates(tmp_path):
    time = np.arange(N) * 0.1
    truth = 20 + 5 * np.sin(time / 4)
    repeated = truth[(np.arange(N) // 5) * 5]
    found = channels(tmp_path, time, plunge(), repeated, reference="c0")
    assert set(kinds(found)) == {"polled"}
    assert "every 0.5 s" in found.cautions[0]
    error = np.abs(found.values["reference"] - truth)[5:-5].max()
    assert error < 0.05 * np.abs(repeated - truth)[5:-5].max()


def test_quantised_step_of_the_reference_keeps_its_edge():
    time = np.arange(N) * 0.1
    rough = np.round(np.where(time < 20, 20.0, 60.0) + 0.03 * np.sin(time * 7), 1)
    assert repairs.polled(time, rough) is None


def test_polled_step_is_drawn_over_one_period_only():
    time = np.arange(N) * 0.1
    noise = 0.003 * np.random.default_rng(4).normal(size=N)
    truth = np.where(time < 20, 20.0, 60.0) + np.round(0.001 * time + noise, 4)
    found = repairs.polled(time, truth[(np.arange(N) // 5) * 5])
    assert found is not None
    values, period = found
    assert period == pytest.approx(0.5)
    assert values[time < 19.4].max() < 20.1
    assert values[time > 20.1].min() > 59.9
