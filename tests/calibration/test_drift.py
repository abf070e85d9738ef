"""Drift between two calibrations, against changes that were put in."""

import re

import numpy as np
import pytest

import deembed
from deembed.calibration.drift import drift, drift_findings
from deembed.errors import GridError, PortError
from deembed.labels import relabel_ports
from deembed.simulate.analyzer import Imperfections, random_analyzer

F = np.linspace(1e8, 8e9, 80)


def terms(change=lambda box: box):
    kit = deembed.load_kit("ideal")
    analyzer = random_analyzer(F, rng=np.random.default_rng(2), imperfections=Imperfections(0, 0, 0, 0))
    analyzer.boxes[1] = change(analyzer.boxes[1].copy())
    readings = [
        deembed.Reading(s, (p,), analyzer.read(relabel_ports(kit.response(s, F), [p])))
        for p in (1, 2)
        for s in ("open", "short", "load")
    ]
    return deembed.solve_sol(readings, kit, ports=(1, 2))


def longer(box):
    """2 ps of cable and 0.2 dB more, each way; directivity off by -46 dB."""
    through = 10 ** (-0.2 / 20) * np.exp(-2j * np.pi * F * 2e-12)
    box[:, 0, 1] *= through
    box[:, 1, 0] *= through
    box[:, 0, 0] += 0.005
    return box


def test_what_was_put_in_comes_out():
    change = drift(terms(), terms(longer))
    np.testing.assert_allclose(change.tracking_db.sel(port_in=2), -0.4, atol=1e-9)
    np.testing.assert_allclose(change.tracking_deg.sel(port_in=2), -360 * F * 4e-12, atol=1e-9)
    assert float(change.tracking_delay_s.sel(port_in=2)) == pytest.approx(4e-12, rel=1e-9)
    np.testing.assert_allclose(change.directivity.sel(port_in=2), 0.005, atol=1e-12)
    for name in change.data_vars:
        np.testing.assert_allclose(change[name].sel(port_in=1), 0, atol=1e-12)


def test_it_is_said_port_by_port():
    one, two = drift_findings(drift(terms(), terms(longer)))
    assert (one.severity, one.where, two.severity, two.where) == ("note", "port 1", "warning", "port 2")
    assert two.text == (
        "Between the two calibrations tracking at port 2 moved by up to 0.4 dB (at 5.5 GHz) and 12 degrees (at 8 GHz), "
        "as 4 ps there and back would, and directivity by -46.02 dB: calibrate again before the part is read."
    ).replace("5.5 GHz", two.text.split("(at ")[1].split(")")[0])
    assert two.worst == pytest.approx(0.4)


def test_ports_without_terms_are_left_out():
    first = terms()
    first["reflection_tracking"] = first.reflection_tracking.where(first.port_in == 2)
    assert [f.where for f in drift_findings(drift(first, terms()))] == ["port 2"]


def test_what_cannot_be_compared():
    with pytest.raises(
        GridError, match="the first calibration has 80 points, 100 MHz to 8 GHz; the second has 10"
    ):
        drift(terms(), terms().isel(frequency=slice(0, 10)))
    with pytest.raises(PortError, match=re.escape("the first calibration has ports [1, 2], the second [1]")):
        drift(terms(), terms().sel(port_in=[1], port_out=[1]))
