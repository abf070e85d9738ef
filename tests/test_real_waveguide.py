"""Real readings in rectangular waveguide, 75 to 110 GHz, as a whole job: with recorded switch terms and without."""

import os

import numpy as np
import pytest

import deembed
from deembed.job import load_job

# The line's length is not stated: about a quarter wave in mid band. WR-10 is 2.54 mm wide (EIA RS-261), so its
# cut-off is c / 2a = 59.01 GHz.
KIT = """
[kit]
name = "waveguide-bench"
[standards.thru]
kind = "thru"
length_m = 0.0
cutoff_hz = 59.01e9
[standards.line]
kind = "line"
length_m = 0.00086
cutoff_hz = 59.01e9
[standards.short]
kind = "reflect"
sign = -1
"""
JOB = """
[job]
title = "Mismatched waveguide line"
part_ports = 2
[analyzer]
ports = 2
{switch}
[calibration]
method = "trl"
kit = "kit.toml"
[[calibration.readings]]
standard = "thru"
ports = [1, 2]
file = "{at}/thru.s2p"
[[calibration.readings]]
standard = "line"
ports = [1, 2]
file = "{at}/line.s2p"
[[calibration.readings]]
standard = "short"
ports = [1, 2]
file = "{at}/reflect.s2p"
[[rounds]]
file = "{at}/mismatched_line.s2p"
analyzer_ports = [1, 2]
part_ports = [1, 2]
[expect]
passive = true
reciprocal = true
"""


@pytest.fixture(scope="module")
def outcomes(measured, tmp_path_factory):
    """The job with the recorded switch terms and without."""
    folder = tmp_path_factory.mktemp("waveguide")
    at = os.path.relpath(measured / "waveguide_trl", folder)
    switch = f'switch_terms = {{ 1 = "{at}/switch_term_reverse.s1p", 2 = "{at}/switch_term_forward.s1p" }}'
    (folder / "kit.toml").write_text(KIT)
    found = {}
    for name, line in (("with", switch), ("without", "")):
        (folder / f"{name}.toml").write_text(JOB.format(at=at, switch=line))
        found[name] = load_job(folder / f"{name}.toml").run()
    return found


def figures(outcome):
    metrics = outcome.metrics
    return float(metrics.largest_singular_value.max()), float(metrics.reciprocity_error_max.max())


def test_figures_of_both(outcomes):
    assert figures(outcomes["with"]) == pytest.approx((1.114, 0.0839), abs=0.001)
    assert figures(outcomes["without"]) == pytest.approx((1.0095, 0.0178), abs=0.0005)


def test_the_findings_say_which_is_physical(outcomes):
    """Switch terms taken off twice leave gain and non-reciprocity: these readings had been freed of them before."""
    kinds = {
        name: {f.kind for f in o.findings if f.severity == "contradiction"} for name, o in outcomes.items()
    }
    assert {"gain", "non-reciprocity"} <= kinds["with"]
    assert "gain" not in kinds["without"]
    worst = {
        name: max(f.worst for f in o.findings if f.kind == "non-reciprocity") for name, o in outcomes.items()
    }
    assert worst["without"] < worst["with"] / 4
    assert outcomes["with"].verdict.startswith("Not believable as a passive part")
    assert "nor as a reciprocal part" in outcomes["with"].verdict


def test_the_line_is_where_the_kit_expects_it(outcomes):
    terms = outcomes["without"].terms
    phase = terms.line_phase.values
    assert phase.min() > 45 and phase.max() < 100
    beta = terms.propagation_constant.values.imag
    f = terms.frequency.values
    expected = 2 * np.pi / 299_792_458 * np.sqrt(f**2 - 59.01e9**2)
    assert np.abs(beta / expected - 1).max() < 0.05


def test_its_outputs_hold_the_same_figures(outcomes, tmp_path):
    outcomes["with"].write(tmp_path / "out")
    assert deembed.read_touchstone(tmp_path / "out/part.s2p").sizes["frequency"] == 647
    report = (tmp_path / "out/report.html").read_text()
    assert "up to 11 % more wave amplitude" in report
