"""Pooling per sensor, medium and speed: what averages, what doesn't, what is said."""

from __future__ import annotations

import math

import pytest

from tauworkbench.campaign.comparison import compare
from tauworkbench.campaign.media import MEDIA_COLUMNS, media_rows, pool_media
from tauworkbench.campaign.outlying import outlying
from tauworkbench.campaign.records import CampaignRun, CampaignSettings
from tauworkbench.records import BudgetLine

from .builders import result, runs

PLAIN = CampaignSettings()


def pooled(*results, **settings):
    return pool_media(runs(*results), CampaignSettings(**settings))[0]


def test_groups_are_sensor_medium_speed_and_quantity():
    found = pooled(
        result(), result(), result(speed_m_s=1.0), result(sensor="P2"), result(medium="oil"),
        result(test="self-heating", quantity="internal-heating"), result(speed_m_s=None),
    )  # fmt: skip
    assert [(m.sensor, m.medium, m.speed_m_s, m.quantity, len(m.members)) for m in found] == [
        ("P1", "oil", 0.4, "ambient-change", 1),
        ("P1", "water", None, "ambient-change", 1),
        ("P1", "water", 0.4, "ambient-change", 2),
        ("P1", "water", 0.4, "internal-heating", 1),
        ("P1", "water", 1.0, "ambient-change", 1),
        ("P2", "water", 0.4, "ambient-change", 1),
    ]


def test_what_all_runs_share_does_not_average_out():
    line = BudgetLine("fixed resistor", 0.05, shared=True)
    (media,) = pooled(*(result(t, 0.001, lines=(line,)) for t in (1.99, 2.0, 2.01, 2.0)))
    scatter = 0.00816497 / 2  # standard deviation of the four over the root of four
    assert media.t63.standard_uncertainty == pytest.approx(scatter, rel=0.02)
    assert media.combined.standard_uncertainty == pytest.approx(math.hypot(scatter, 0.05), rel=1e-3)
    assert media.combined.above.degrees_of_freedom > 1000
    assert [x.source for x in media.shared] == ["fixed resistor"]


def test_what_is_each_runs_own_averages_out():
    line = BudgetLine("onset marker", 0.04)
    (media,) = pooled(*(result(t, 0.03, lines=(line,)) for t in (1.999, 2.0, 2.001, 2.0)))
    assert media.t63.within_u == pytest.approx(0.05)
    assert media.combined.standard_uncertainty == pytest.approx(0.025)


def test_an_effect_of_one_sign_widens_one_side_and_does_not_average():
    line = BudgetLine("found onset (hidden fast response)", 0.1, side="high")
    (media,) = pooled(*(result(t, 0.001, lines=(line,)) for t in (1.99, 2.0, 2.01)))
    low, _ = media.t63.interval()
    assert media.combined.low == pytest.approx(low)
    # the scatter's own Student factor must not multiply what is known of the effect
    assert media.combined.high == pytest.approx(2.0 + 1.96 * 0.1, rel=0.01)


def test_heating_and_cooling_are_held_against_each_other():
    results = [result(t, 0.005) for t in (2.10, 2.11, 2.09)]
    results += [result(t, 0.005, heating=False) for t in (2.00, 1.99, 2.01)]
    (media,) = pooled(*results)
    assert media.heating_minus_cooling.value == pytest.approx(0.1)
    assert any("heating takes +0.1 s against cooling" in c for c in media.cautions)
    assert next(media_rows([media]))["heating_minus_cooling_s"] == pytest.approx(0.1)


def test_few_repeats_and_far_ones_are_cautions():
    (media,) = pooled(result(2.0), result(2.6))
    words = "\n".join(media.cautions)
    assert "2 runs; 3 repeats or more" in words
    assert "run_1 lies 13% above the mean" in words
    (media,) = pooled(result(2.0), result(2.02), result(1.99))
    assert media.cautions == ()


def test_an_outlying_run_is_named_and_stays():
    results = [result(t, 0.002) for t in (2.0, 2.01, 1.99, 2.005, 2.15)]
    (media,) = pooled(*results)
    assert media.outlying == ("run_4",)
    assert len(media.members) == 5
    assert media.t63.mean == pytest.approx(2.031, abs=1e-3)


@pytest.mark.parametrize(
    ("count", "critical"),
    # Grubbs' two-sided critical values at 5 % (any table; from memory)
    [(4, 1.481), (5, 1.715), (6, 1.887), (8, 2.126)],
)
def test_outlying_is_grubbs_test(count, critical):
    base = [(-1.0) ** i * (1 + 0.1 * i) for i in range(count - 1)]
    if count % 2 == 0:
        base[0] -= sum(base)

    def statistic(x):
        values = [*base, x]
        mean = sum(values) / count
        return (x - mean) / math.sqrt(sum((v - mean) ** 2 for v in values) / (count - 1))

    low, high = 1.0, 1000.0
    while high - low > 1e-6:
        middle = (low + high) / 2
        apart = outlying([*base, middle], [0.0] * count)
        low, high = (low, middle) if count - 1 in apart else (middle, high)
    assert statistic(low) == pytest.approx(critical, abs=2e-3)


def test_an_open_interval_is_in_no_mean_and_said():
    media, cautions = pool_media(runs(result(2.0, None), result(2.0)), PLAIN)
    assert [len(m.members) for m in media] == [1]
    assert cautions[0].startswith("run_0: ")


def test_decision_is_on_the_combined_mean():
    line = BudgetLine("law", 0.5, shared=True)
    good = [result(t, 0.001) for t in (2.0, 2.01, 1.99)]
    wide = [result(t, 0.001, lines=(line,)) for t in (2.0, 2.01, 1.99)]
    assert pooled(*good, limit_s=2.5)[0].decision.decision == "pass"
    assert pooled(*good, limit_s=1.5)[0].decision.decision == "fail"
    assert pooled(*wide, limit_s=2.5)[0].decision.decision == "undecided"
    assert pooled(*good)[0].decision is None


def test_rows_have_the_columns_and_empty_cells_where_nothing_is_known():
    (row,) = media_rows(pooled(result(2.0)))
    assert tuple(row) == MEDIA_COLUMNS
    assert row["repeatability_s"] is None
    assert row["decision"] is None
    assert row["runs"] == 1


def test_unlike_mountings_in_one_group_are_said():
    found = pooled(*(result(conditions={"mounting": m}) for m in ("bare", "bare", "potted")))
    assert "unlike mounting (bare, potted)" in found[0].cautions[0]


def test_two_sensors_15_per_cent_apart():
    one = [result(t, 0.01, sensor="P1") for t in (2.00, 2.03, 1.97)]
    other = [result(t, 0.01, sensor="P2") for t in (2.30, 2.34, 2.26)]
    (comparison,), _ = compare(pooled(*one, *other))
    assert comparison.what == "sensors"
    assert (comparison.of[:2], comparison.to[:2]) == ("P2", "P1")
    assert comparison.t63.value == pytest.approx(1.15)
    assert 1.05 < comparison.t63.low < 1.15 < comparison.t63.high < 1.25


def test_a_shared_error_cancels_between_media_of_one_sensor_only():
    def three(mean, **run):
        line = BudgetLine("law", 0.1 * mean, shared=True)
        return [result(f * mean, 1e-4, lines=(line,), **run) for f in (0.999, 1.0, 1.001)]

    media = pooled(*three(2.0), *three(20.0, medium="air"), *three(2.0, sensor="P2"))
    found = {c.what: c.t63 for c in compare(media)[0]}
    assert found["media"].value == pytest.approx(10.0, rel=1e-3)
    assert found["media"].standard_uncertainty < 0.01 * 10
    assert found["sensors"].standard_uncertainty == pytest.approx(0.1 * math.sqrt(2), rel=1e-2)


def test_two_depths_give_the_stems_share():
    def at(depth, mean):
        return [result(mean + d, 0.001, conditions={"immersion_mm": depth}) for d in (-0.01, 0.01)]

    (comparison,), _ = compare(pooled(*at(30.0, 2.2), *at(60.0, 2.0)))
    assert comparison.what == "immersion depths"
    assert comparison.t63.value == pytest.approx(1.1)


def test_several_steps_of_one_run_are_repeats():
    run = CampaignRun("a", (result(2.0), result(2.1, number=2, heating=False)))
    (media,), _ = pool_media((run,), PLAIN)
    assert [m.run for m in media.members] == ["a", "a, step 2"]
