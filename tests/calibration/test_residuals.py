"""Standards predicted back through the solved model: silent without excess readings, naming the odd one with them."""

import numpy as np
import pytest

from deembed.calibration import Reading, solve_sol, solve_solt
from deembed.calibration.residuals import residual_findings, standard_residuals
from deembed.labels import relabel_ports
from deembed.simulate.analyzer import Imperfections, random_analyzer
from deembed.standards import kit_from_text

F = np.linspace(50e6, 8e9, 101)
KIT = kit_from_text(
    '[kit]\nname = "bench"\n[standards.open]\nkind = "open"\n[standards.short]\nkind = "short"\n'
    '[standards.load]\nkind = "load"\n[standards.far]\nkind = "short"\noffset_delay_ps = 17.0\n'
    '[standards.near]\nkind = "open"\noffset_delay_ps = 9.0\n[standards.thru]\nkind = "thru"\n'
    '[standards.reflect]\nkind = "reflect"\n',
    where="bench.toml",
)
QUIET = Imperfections(0.0, 0.0, 0.0, 0.0)


def read(names, *, ports=(1, 2), thru=True, imperfections=QUIET, wrong=()):
    analyzer = random_analyzer(F, rng=np.random.default_rng(5), imperfections=imperfections)
    analyzer.leakage[:] = 0
    readings = []
    for port in ports:
        for name in names:
            true = KIT.response(name, F)
            if (name, port) in wrong:
                true = true * np.exp(-1j * np.radians(6.0))
            readings.append(
                Reading(name, (port,), analyzer.read(relabel_ports(true.assign_coords(z0=true.z0), [port])))
            )
    if thru:
        readings.append(Reading("thru", (1, 2), analyzer.read(KIT.response("thru", F))))
    return readings


def test_without_readings_in_excess_everything_is_given_back():
    readings = read(["open", "short", "load"])
    residuals = standard_residuals(solve_solt(readings, KIT), readings, KIT)
    assert sorted(residuals) == ["load 1", "load 2", "open 1", "open 2", "short 1", "short 2", "thru 1-2"]
    assert max(float(np.abs(r).max()) for r in residuals.values()) < 1e-12
    assert residual_findings(solve_solt(readings, KIT), readings, KIT) == []


def test_noise_and_connectors_alone_are_not_accused():
    readings = read(["open", "short", "load", "far", "near"], imperfections=Imperfections())
    assert residual_findings(solve_solt(readings, KIT), readings, KIT) == []


def test_the_standard_that_contradicts_the_others_is_named_first():
    readings = read(["open", "short", "load", "far", "near"], wrong=[("far", 2)])
    found = residual_findings(solve_solt(readings, KIT), readings, KIT)
    assert found[0].where == "far 2" and found[0].kind == "standard-residual"
    assert not any(f.where.endswith(" 1") for f in found)
    assert "gives far 2 back only to -" in found[0].text and "dB of full scale" in found[0].text


def test_one_port_calibrations_have_residuals_too():
    readings = read(["open", "short", "load", "far"], ports=(1,), thru=False, wrong=[("short", 1)])
    found = residual_findings(solve_sol(readings, KIT), readings, KIT)
    assert {f.where.split()[1] for f in found} == {"1"} and found[0].worst > 0.01


def test_what_nobody_knows_has_no_residual():
    readings = read(["open", "short", "load"])
    terms = solve_solt(readings, KIT)
    nothing = Reading("isolation", (1, 2), readings[-1].raw)
    unknown = Reading("reflect", (1,), readings[0].raw)
    assert set(standard_residuals(terms, [nothing, unknown], KIT)) == set()


@pytest.mark.parametrize("drive", ["every-port", "first-port-only"])
def test_only_driven_columns_count(drive):
    readings = read(["open", "short", "load"], ports=(1, 2) if drive == "every-port" else (1,))
    terms = solve_solt(readings, KIT, drive=drive)
    residual = standard_residuals(terms, readings, KIT)["thru 1-2"]
    driven = np.isfinite(residual.values).all(axis=(0, 1))
    np.testing.assert_array_equal(driven, [True, drive == "every-port"])
    assert residual_findings(terms, readings, KIT) == []
