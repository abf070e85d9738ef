"""Raw readings, rounds, both readings of a reflection, arms."""

import numpy as np
import pytest
import xarray as xr

from deembed.errors import PortError
from deembed.shell import arm_of, shell_from_network
from deembed.views import readings


def test_raw_is_the_file_as_read(outcome):
    path = "raw/part_12.s2p"
    p = readings.raw(outcome.raw[path], path=path)
    assert p.name == "raw.raw/part_12.s2p"
    t = next(t for t in p.traces if t.name == "S21")
    want = 20 * np.log10(np.abs(outcome.raw[path].sel(port_out=2, port_in=1).values))
    assert np.allclose(t.y, want, atol=1e-12)


def test_a_round_is_labelled_by_part_ports(outcome):
    p = readings.round_picture(outcome.rounds[1], label="2-3")
    assert {t.name for t in p.traces} == {"S22", "S33", "S32", "S23"}
    assert "Round 2-3" in p.title


def test_both_readings_of_a_reflection_stand_side_by_side(outcome):
    p = readings.reflection_readings(outcome.rounds, port=1, labels=["1-2", "2-3", "3-1"])
    assert [t.name for t in p.traces] == ["in round 1-2", "in round 3-1"]
    want = 20 * np.log10(np.abs(outcome.rounds[2].sel(port_out=1, port_in=1).values))
    assert np.allclose(p.traces[1].y, want, atol=1e-12)
    assert p.traces[0].dash != p.traces[1].dash


def test_disagreement_is_the_distance_between_the_readings(outcome):
    """The made-up readings of part port p lie 0.004 p apart."""
    p = readings.disagreement(outcome.disagreement)
    assert [t.name for t in p.traces] == ["part port 1", "part port 2", "part port 3"]
    for k, t in enumerate(p.traces):
        assert np.allclose(t.y, 0.004 * (k + 1), rtol=1e-9)
    assert "at most 0.012 (part port 3" in p.alt


def test_a_port_read_once_has_no_disagreement(outcome):
    spread = outcome.disagreement.copy()
    spread[0, :, 0] = np.nan
    p = readings.disagreement(spread)
    assert [t.name for t in p.traces] == ["part port 2", "part port 3"]
    assert p.missing == ("part port 1",)
    assert "no port was read twice" in readings.disagreement(spread.where(False)).alt


def test_three_readings_give_the_widest_distance():
    values = np.array([0.0, 0.3, -0.1])[:, None, None] * np.ones((3, 2, 1))
    spread = xr.DataArray(
        values.astype(complex),
        dims=("round", "frequency", "port"),
        coords={"round": ["1-2", "2-1", "1-3"], "frequency": [1e9, 2e9], "port": [1]},
    )
    assert readings.disagreement(spread).traces[0].y == pytest.approx([0.4, 0.4])


def test_an_arm_shows_its_own_network_and_delay(outcome, fake):
    p = readings.arm(outcome.shell, port=2)
    own = arm_of(outcome.shell, 2)
    t = next(t for t in p.traces if t.name == "S21")
    assert np.allclose(t.y, 20 * np.log10(np.abs(own.sel(port_out=2, port_in=1).values)), atol=1e-12)
    d = readings.arm_delay(outcome.shell, port=2)
    assert np.allclose(d.traces[0].y, fake.ARM_PS[2], rtol=1e-6)
    with pytest.raises(PortError, match="no arm at part port 9"):
        readings.arm(outcome.shell, port=9)


def test_coupling_shows_what_leaks_from_arm_to_arm(outcome):
    f = outcome.part.frequency.values
    values = np.zeros((f.size, 4, 4), complex)
    values[:, 2, 0] = values[:, 0, 2] = values[:, 3, 1] = values[:, 1, 3] = 0.9
    values[:, 3, 0] = values[:, 0, 3] = 0.01
    from deembed.labels import sparams

    shell = shell_from_network(sparams(values, f), analyzer_side_ports=[1, 2], part_side_ports=[3, 4])
    p = readings.coupling(shell)
    assert {t.name: round(float(t.y[0])) for t in p.traces} == {"S21": -40}
    assert p.missing == ("S12",)
