"""Pictures of the physical figures equal the metrics they are given."""

import numpy as np
import pytest

from deembed.errors import DeembedError
from deembed.views import part


@pytest.fixture(scope="module")
def metrics(outcome):
    return outcome.metrics


def test_gain_ceiling_is_the_largest_singular_value_with_its_limit(outcome, metrics):
    p = part.gain_ceiling(metrics)
    want = np.linalg.svd(outcome.part.values, compute_uv=False)[:, 0]
    assert np.allclose(p.traces[0].y, want, rtol=1e-12)
    assert [m.value for m in p.limits] == [1.0]
    k = int(np.argmax(want))
    assert f"at most {want[k]:.4g} at {outcome.part.frequency.values[k] / 1e9:.4g} GHz" in p.alt
    assert "26 % above the passive limit" in p.alt


def test_a_passive_part_is_said_to_be_within_the_limit(metrics):
    quiet = metrics.assign(largest_singular_value=metrics.largest_singular_value * 0.5)
    assert "within the passive limit of 1" in part.gain_ceiling(quiet).alt


def test_reciprocity_has_one_curve_per_pair(outcome, metrics):
    p = part.reciprocity(metrics)
    assert [t.name for t in p.traces] == ["|S21 − S12|", "|S31 − S13|", "|S32 − S23|"]
    s = outcome.part
    want = np.abs(s.sel(port_out=2, port_in=1) - s.sel(port_out=1, port_in=2)).values
    assert np.allclose(p.traces[0].y, want, atol=1e-15)
    assert p.y_floor == 0.0


def test_power_balance_is_the_column_sum_per_driven_port(outcome, metrics):
    p = part.power_balance(metrics)
    assert [t.name for t in p.traces] == ["driven at 1", "driven at 2", "driven at 3"]
    want = (np.abs(outcome.part.sel(port_in=2).values) ** 2).sum(axis=1)
    assert np.allclose(p.traces[1].y, want, rtol=1e-12)
    assert f"highest {p.traces[0].y.max():.3g} (driven at 1" in p.alt


def test_three_way_shows_sum_and_floor_and_says_the_distance(metrics):
    p = part.three_way(metrics)
    assert np.array_equal(p.traces[0].y, metrics.reflection_sum.values)
    assert np.array_equal(p.traces[1].y, metrics.three_way_floor.values)
    slack = (metrics.reflection_sum - metrics.three_way_floor).values.min()
    assert f"smallest distance {slack:+.3g}" in p.alt
    assert "below what" not in p.alt
    broken = metrics.assign(reflection_sum=metrics.three_way_floor - 0.1)
    assert "smallest distance -0.1" in part.three_way(broken).alt
    assert "below what a reciprocal part can show" in part.three_way(broken).alt


def test_lossless_error_is_shown_as_given(metrics):
    p = part.lossless_error(metrics)
    assert np.array_equal(p.traces[0].y, metrics.lossless_error.values)
    assert f"at most {p.traces[0].y.max():.3g}" in p.alt


@pytest.mark.parametrize(
    "make", [part.gain_ceiling, part.reciprocity, part.power_balance, part.lossless_error]
)
def test_metrics_without_values_say_so(metrics, make):
    p = make(metrics.where(False))
    assert p.traces == ()
    assert p.missing
    assert "no values" in p.alt


def test_leading_dimensions_are_refused(metrics):
    with pytest.raises(DeembedError, match="the metrics also runs along draw"):
        part.gain_ceiling(metrics.expand_dims(draw=2))
