"""The same lines of our code run for a long sweep as for a short one: no loop over frequency, hidden or plain."""

import sys
from pathlib import Path

import numpy as np
import pytest

import deembed
from deembed.labels import relabel_ports, select_ports, sparams
from deembed.shell import shell_from_arms
from deembed.simulate.analyzer import random_analyzer
from deembed.threeport import assemble

OURS = str(Path(deembed.__file__).parent)


def lines_run(act):
    """How many lines of the package a call executes."""
    count = 0

    def trace(frame, event, _):
        nonlocal count
        if not frame.f_code.co_filename.startswith(OURS):
            return None
        count += event == "line"
        return trace

    before = sys.gettrace()
    sys.settrace(trace)
    try:
        act()
    finally:
        sys.settrace(before)
    return count


def readings(f, names, kit, *, ports=(1, 2)):
    analyzer = random_analyzer(f, rng=np.random.default_rng(4))
    out = []
    for name in names:
        true = kit.response(name, f)
        for p in ports if true.sizes["port_out"] == 1 else [ports]:
            own = (p,) if true.sizes["port_out"] == 1 else ports
            out.append(deembed.Reading(name, own, analyzer.read(relabel_ports(true, own))))
    return out


def solt(f):
    kit = deembed.load_kit("generic-coax-3p5mm")
    given = readings(f, ["open", "short", "load", "thru"], kit)
    return lambda: deembed.solve_solt(given, kit)


def trl(f):
    kit = deembed.load_kit("demo-board-lines")
    given = readings(f, ["thru", "line", "reflect"], kit)
    return lambda: deembed.solve_trl(given, kit)


def correct(f):
    terms = solt(f)()
    raw = sparams(np.full((f.size, 2, 2), 0.3), f)
    return lambda: deembed.correct(terms, raw)


def predict(f):
    terms = solt(f)()
    part = sparams(np.full((f.size, 2, 2), 0.3), f)
    return lambda: deembed.predict_raw(terms, part)


def assembled(f):
    rng = np.random.default_rng(5)
    part = sparams(0.4 * rng.normal(size=(f.size, 3, 3)), f)
    rounds = [select_ports(part, pair) for pair in ([1, 2], [2, 3], [3, 1])]
    return lambda: assemble(rounds, terminations={1: 0.1, 2: -0.2j, 3: 0.05})


def stripped(f):
    arm = sparams(np.broadcast_to([[0.1, 0.8], [0.8, 0.1]], (f.size, 2, 2)), f)
    part = sparams(np.full((f.size, 2, 2), 0.3), f)

    def act():
        shell = shell_from_arms({1: arm, 2: arm})
        deembed.strip(shell, deembed.embed(shell, part))

    return act


@pytest.mark.parametrize("work", [solt, trl, correct, predict, assembled, stripped], ids=lambda w: w.__name__)
def test_a_long_sweep_runs_no_more_lines_than_a_short_one(work):
    short, long = (np.linspace(1e9, 6e9, n) for n in (21, 420))
    work(short)()  # what is loaded on first use must not count
    few, many = (lines_run(work(f)) for f in (short, long))
    # What is said of the result may take a line more or less; a loop over frequency would take 399.
    assert few > 10 and many - few < 150


def test_the_check_sees_a_loop():
    from deembed import words

    assert lines_run(lambda: [words.percent(0.1) for _ in range(30)]) > lines_run(lambda: words.percent(0.1))
