"""The simulated analyzer: what calibrations must undo, and the noise it is said to have."""

import numpy as np
import pytest

import deembed
from deembed.labels import relabel_ports, select_ports, sparams
from deembed.simulate.analyzer import Imperfections, random_analyzer
from deembed.simulate.parts import PARTS

F = np.linspace(50e6, 8e9, 81)
QUIET = Imperfections(0.0, 0.0, 0.0, 0.0)


def solt_readings(analyzer, kit, ports, driven=None):
    readings = []
    for port in driven or ports:
        for standard in ("open", "short", "load"):
            true = relabel_ports(kit.response(standard, analyzer.frequency), [port])
            readings.append(deembed.Reading(standard, (port,), analyzer.read(true)))
    for i, a in enumerate(ports):
        for b in ports[i + 1 :]:
            true = relabel_ports(kit.response("thru", analyzer.frequency), [a, b])
            readings.append(deembed.Reading("thru", (a, b), analyzer.read(true)))
    return readings


def without_leakage(analyzer):
    analyzer.leakage[:] = 0
    return analyzer


@pytest.mark.parametrize("count", [2, 3, 4])
def test_solt_undoes_it_exactly(count, rng):
    analyzer = without_leakage(random_analyzer(F, rng=rng, ports=count, imperfections=QUIET))
    kit = deembed.load_kit("generic-coax-3p5mm")
    ports = tuple(range(1, count + 1))
    terms = deembed.solve_solt(solt_readings(analyzer, kit, ports), kit, ports=ports)
    part = select_ports(PARTS["isolating-splitter"](F), [1, 2, 3][: min(count, 3)])
    error = deembed.correct(terms, analyzer.read(part)) - part
    assert float(np.abs(error).max()) < 1e-9
    # Boxes and switch terms obey the redundant relation to the last digit.
    assert float(np.abs(terms.redundancy).max()) < 1e-9


def test_leakage_is_undone_by_isolation_readings(rng):
    analyzer = random_analyzer(F, rng=rng, imperfections=QUIET)
    kit = deembed.load_kit("ideal")
    readings = solt_readings(analyzer, kit, (1, 2))
    loads = sparams(np.zeros((F.size, 2, 2)), F)
    readings.append(deembed.Reading("isolation", (1, 2), analyzer.read(loads)))
    part = relabel_ports(select_ports(PARTS["isolating-splitter"](F), [2, 3]), [1, 2])
    raw = analyzer.read(part)
    with_it = deembed.correct(deembed.solve_solt(readings, kit, isolation=True), raw) - part
    without = deembed.correct(deembed.solve_solt(readings, kit), raw) - part
    assert float(np.abs(with_it).max()) < 1e-7 < float(np.abs(without).max())


def test_trl_with_its_switch_terms_undoes_it_exactly(rng):
    f = np.linspace(1e9, 6.5e9, 81)
    analyzer = without_leakage(random_analyzer(f, rng=rng, imperfections=QUIET))
    kit = deembed.load_kit("demo-board-lines")
    two = [deembed.Reading(name, (1, 2), analyzer.read(kit.response(name, f))) for name in ("thru", "line")]
    short = sparams(np.broadcast_to(0.97 * np.eye(2), (f.size, 2, 2)), f)
    two.append(deembed.Reading("reflect", (1, 2), analyzer.read(short)))
    terms = deembed.solve_trl(two, kit, switch_terms=analyzer.recorded_switch_terms())
    part = select_ports(PARTS["isolating-splitter"](f), [1, 2])
    assert float(np.abs(deembed.correct(terms, analyzer.read(part)) - part).max()) < 1e-9


def test_where_the_first_port_alone_drives_the_part_is_turned(rng):
    analyzer = without_leakage(random_analyzer(F, rng=rng, imperfections=QUIET, first_port_only=True))
    kit = deembed.load_kit("ideal")
    readings = solt_readings(analyzer, kit, (1, 2), driven=[1])
    terms = deembed.solve_solt(readings, kit, drive="first-port-only")
    part = select_ports(PARTS["circulator"](F), [1, 2])
    turned = relabel_ports(select_ports(part, [2, 1]), [1, 2])
    raw = analyzer.read(part)
    assert np.all(raw.values[:, :, 1] == 0)
    error = deembed.correct(terms, raw, turned=analyzer.read(turned)) - part
    assert float(np.abs(error).max()) < 1e-9


def test_noise_has_the_size_it_is_said_to_have(rng):
    f = np.linspace(1e9, 2e9, 4001)
    noisy = random_analyzer(f, rng=rng, imperfections=Imperfections(1e-3, 1e-5, 0.0, 0.0))
    short = sparams(-np.ones((f.size, 1, 1)), f)
    ratio = noisy.read(short).values / noisy.perfect().read(short).values - 1
    assert np.sqrt(np.mean(np.abs(ratio) ** 2)) == pytest.approx(1e-3, rel=0.05)
    nothing = sparams(np.zeros((f.size, 2, 2)), f)
    clean, read = (without_leakage(a).read(nothing).values[:, 1, 0] for a in (noisy.perfect(), noisy))
    assert np.std(read - clean) == pytest.approx(1e-5, rel=0.05)


def test_each_connection_is_made_afresh(rng):
    analyzer = random_analyzer(F, rng=rng, imperfections=Imperfections(0.0, 0.0, 1e-3, 0.0))
    load = sparams(np.zeros((F.size, 1, 1)), F)
    reads = np.stack([analyzer.read(load).values[:, 0, 0] for _ in range(300)])
    spread = np.sqrt(np.mean(np.abs(reads - reads.mean(axis=0)) ** 2, axis=0))
    gain = np.abs(analyzer.boxes[0][:, 0, 1] * analyzer.boxes[0][:, 1, 0])
    np.testing.assert_allclose(spread, 1e-3 * F / 10e9 * gain, rtol=0.25)


def test_drift_grows_from_reading_to_reading(rng):
    analyzer = random_analyzer(F, rng=rng, imperfections=Imperfections(0.0, 0.0, 0.0, 1e-4))
    short = sparams(-np.ones((F.size, 1, 1)), F)
    first, *_, last = (analyzer.read(short).values[-1, 0, 0] for _ in range(21))
    change = last / first - 1
    assert 20 * 1e-4 < abs(change) < 3 * 20 * 1e-4


def test_one_seed_gives_one_analyzer():
    a, b = (random_analyzer(F, rng=np.random.default_rng(7)) for _ in range(2))
    np.testing.assert_array_equal(a.boxes, b.boxes)
    short = sparams(-np.ones((F.size, 1, 1)), F)
    np.testing.assert_array_equal(a.read(short).values, b.read(short).values)


def test_leakage_comes_from_the_driven_port_into_the_receiver(rng):
    analyzer = random_analyzer(F, rng=rng, ports=3, imperfections=QUIET)
    nothing = sparams(np.zeros((F.size, 3, 3)), F)
    raw = analyzer.read(nothing).values
    for receiver, drive in ((0, 1), (1, 0), (2, 0), (0, 2)):
        np.testing.assert_allclose(
            raw[:, receiver, drive], analyzer.leakage[:, receiver, drive], rtol=1e-12, atol=0
        )


def test_cables_turn_the_phase_by_skin_effect_as_much_as_they_damp(rng):
    f = np.linspace(50e6, 8e9, 1601)
    for box in random_analyzer(f, rng=rng).boxes:
        both_ways = box[:, 0, 1] * box[:, 1, 0]
        root = np.sqrt(f / 1e9)
        loss = np.linalg.lstsq(np.stack([np.ones_like(f), root], -1), -np.log(np.abs(both_ways)), rcond=None)[
            0
        ][1]
        phase = np.unwrap(np.angle(both_ways))
        steps = np.stack([np.diff(f), np.diff(root)], -1) / [1e9, 1]
        turn = -np.linalg.lstsq(steps, np.diff(phase), rcond=None)[0][1]
        assert turn == pytest.approx(loss, rel=1e-6)


def test_a_connection_loses_nothing_and_is_the_same_both_ways(rng):
    """A gap or a misplaced pin stores energy, it burns none: the joint alone is lossless and reciprocal."""
    analyzer = random_analyzer(F, rng=rng, imperfections=Imperfections(0.0, 0.0, 0.05, 0.0))
    through = np.broadcast_to(np.array([[0.0, 1.0], [1.0, 0.0]], dtype=complex), (F.size, 2, 2))
    joint = analyzer._connection(through)
    np.testing.assert_allclose(
        joint.conj().swapaxes(-1, -2) @ joint, np.broadcast_to(np.eye(2), joint.shape), atol=1e-12
    )
    np.testing.assert_allclose(joint[:, 0, 1], joint[:, 1, 0], atol=1e-15)
    assert np.abs(joint[-1, 0, 0]) > 1e-3
