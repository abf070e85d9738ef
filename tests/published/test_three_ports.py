"""Textbook three-ports whose properties are known in closed form.

Scattering matrices of the resistive divider, the circulator, the quadrature hybrid and the resistor-isolated
divider as in Pozar, Microwave Engineering, chapter on power dividers and directional couplers (from memory,
recomputed here from circuit theory where that is possible); `skrf.data.tee` ships with scikit-rf 2.2.
"""

import numpy as np
import pytest

from deembed.labels import sparams
from deembed.networks import close_ports, from_admittance
from deembed.physicality import assess, verdict

F = np.linspace(1e9, 10e9, 19)
ROOT = np.sqrt(0.5)


def constant(matrix, **options):
    return sparams(
        np.broadcast_to(np.asarray(matrix, dtype=complex), (F.size, *np.shape(matrix))), F, **options
    )


def holds(metrics):
    return {str(p): bool(metrics.holds.sel(property=p).all()) for p in metrics.property.values}


def star(resistance, z0=50.0):
    """Three resistors [ohm] from the ports to one node: Y = diag(g) - g g^T / sum(g) (Kirchhoff)."""
    g = 1 / np.asarray(resistance, dtype=float)
    return from_admittance(constant(np.diag(g) - np.outer(g, g) / g.sum()), z0=z0)


def test_resistive_three_way_divider():
    """Star of Z0/3: matched, every path -6.02 dB, half of the power lost."""
    part = star([50 / 3] * 3)
    np.testing.assert_allclose(20 * np.log10(np.abs(part.sel(port_out=2, port_in=1))), -6.02, atol=0.005)
    metrics, findings = assess(part, expect={"passive": True, "reciprocal": True, "lossless": False})
    assert holds(metrics) == {"matched": True, "reciprocal": True, "lossless": False}
    np.testing.assert_allclose(metrics.dissipation, 0.5, atol=1e-12)
    assert {f.severity for f in findings} == {"note"}
    assert [f.kind for f in assess(part, expect={"lossless": True})[1] if f.severity == "contradiction"] == [
        "lossless"
    ]


def test_reactive_tee_of_two_ways():
    """Lossless junction of 50 into two 100 ohm lines: matched at the input, the outputs reflect 1/2."""
    rows = [[0, ROOT, ROOT], [ROOT, -0.5, 0.5], [ROOT, 0.5, -0.5]]
    junction = constant(rows, z0=[50.0, 100.0, 100.0])
    metrics, findings = assess(junction, expect={"passive": True, "reciprocal": True, "lossless": True})
    assert holds(metrics) == {"matched": False, "reciprocal": True, "lossless": True}
    np.testing.assert_allclose(metrics.three_way_slack, 0, atol=1e-12)
    np.testing.assert_allclose(metrics.reflection_sum, 1, atol=1e-12)
    assert not [f for f in findings if f.severity != "note"]


def test_the_junction_from_circuit_theory():
    """The same junction as one node, through resistors too small to matter."""
    rows = [[0, ROOT, ROOT], [ROOT, -0.5, 0.5], [ROOT, 0.5, -0.5]]
    np.testing.assert_allclose(star([1e-5] * 3, z0=[50.0, 100.0, 100.0])[0], rows, atol=1e-6)


def test_ideal_circulator_raises_no_false_alarm():
    part = constant([[0, 0, 1], [1, 0, 0], [0, 1, 0]])
    expect = {"passive": True, "reciprocal": False, "lossless": True}
    metrics, findings = assess(part, expect=expect)
    assert holds(metrics) == {"matched": True, "reciprocal": False, "lossless": True}
    assert {f.severity for f in findings} == {"note"}
    assert verdict(findings, expect=expect).startswith(
        "Physical as far as these readings can show: passive and loss"
    )
    wrong = assess(part, expect={"reciprocal": True})[1]
    assert "non-reciprocity" in [f.kind for f in wrong if f.severity == "contradiction"]


@pytest.mark.parametrize("reflection", [0.0, 1.0, -0.4j])
def test_quadrature_hybrid_with_one_port_closed(reflection):
    """Its isolated port matched: matched, reciprocal, lossy; open: lossless and no more matched."""
    hybrid = constant(-ROOT * np.array([[0, 1j, 1, 0], [1j, 0, 0, 1], [1, 0, 0, 1j], [0, 1, 1j, 0]]))
    part = close_ports(hybrid, {4: reflection})
    metrics, findings = assess(part, expect={"passive": True, "reciprocal": True})
    assert holds(metrics) == {
        "matched": reflection == 0,
        "reciprocal": True,
        "lossless": abs(reflection) == 1,
    }
    np.testing.assert_allclose(metrics.dissipation, (1 - abs(reflection) ** 2) / 3, atol=1e-12)
    assert {f.severity for f in findings} == {"note"}


def test_tee_shipped_with_scikit_rf():
    """`skrf.data.tee` (scikit-rf 2.2): lossless, reciprocal, reflections of 1/3, law met with equality."""
    import skrf

    network = skrf.data.tee
    part = sparams(network.s, network.f)
    metrics, findings = assess(
        part, expect={"passive": True, "reciprocal": True, "lossless": True}, tolerance=1e-6
    )
    assert holds(metrics) == {"matched": False, "reciprocal": True, "lossless": True}
    np.testing.assert_allclose(np.abs(part.values[:, range(3), range(3)]), 1 / 3, atol=1e-6)
    np.testing.assert_allclose(metrics.three_way_slack, 0, atol=1e-6)
    assert {f.severity for f in findings} == {"note"}


def test_resistor_isolated_divider_meets_the_floor():
    """Ideal two-way divider with isolation resistor: a mean 1/3 of the power lost, and no less possible."""
    part = constant(-1j * ROOT * np.array([[0, 1, 1], [1, 0, 0], [1, 0, 0]]))
    metrics, findings = assess(part, expect={"passive": True, "reciprocal": True})
    np.testing.assert_allclose(metrics.dissipation, 1 / 3, atol=1e-12)
    np.testing.assert_allclose(metrics.dissipation_floor, 1 / 3, atol=1e-12)
    np.testing.assert_allclose(metrics.three_way_slack, 0, atol=1e-12)
    assert {f.severity for f in findings} == {"note"}


def test_thompson_inequality_on_random_symmetric_matrices():
    """Thompson 1979, Linear Algebra Appl. 26: |d1| + |d2| + |d3| >= s2 + s3 - s1, complex symmetric."""
    rng = np.random.default_rng(1979)
    a = rng.normal(size=(20_000, 3, 3)) + 1j * rng.normal(size=(20_000, 3, 3))
    unitary = np.linalg.svd(a)[0]
    values = rng.uniform(0.9, 1, size=(20_000, 1, 3))  # nearly lossless: there the bound is tight
    s = unitary * values @ unitary.swapaxes(1, 2)
    slack = assess(sparams(s, np.arange(1.0, 20_001.0)))[0].three_way_slack
    assert slack.min() > -1e-12 and slack.min() < 0.05
