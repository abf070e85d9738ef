"""How long calibrations take beside scikit-rf, at 10001 points: ``python tests/benchmarks/bench_solvers.py``.

Ours: from labelled readings to labelled error terms, models of the standards and all checks included.
scikit-rf: from networks that are already built to the first use of the coefficients. Both solve the same readings and
their terms are compared before anything is printed. Prints a Markdown table.
"""

from __future__ import annotations

import os

for _name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ.setdefault(_name, "1")

import time  # noqa: E402
import warnings  # noqa: E402
from collections.abc import Callable  # noqa: E402
from statistics import median  # noqa: E402

import numpy as np  # noqa: E402
import skrf  # noqa: E402

from deembed import __version__  # noqa: E402
from deembed.calibration import Reading, correct, solve_solt, solve_trl  # noqa: E402
from deembed.labels import relabel_ports, sparams  # noqa: E402
from deembed.simulate.analyzer import Imperfections, random_analyzer  # noqa: E402
from deembed.standards import Kit, load_kit  # noqa: E402

POINTS = 10001
ROUNDS = 7
QUIET = Imperfections(0.0, 0.0, 0.0, 0.0)
ONE_PORT = ("short", "open", "load")


def network(s) -> skrf.Network:
    """A network of scikit-rf, built before any clock runs."""
    frequency = skrf.Frequency.from_f(s.frequency.values, unit="Hz")
    return skrf.Network(frequency=frequency, s=s.values, z0=50)


def on_both(kit: Kit, standard: str, f: np.ndarray):
    """A one-port standard on each of two ports."""
    return sparams(kit.response(standard, f).values * np.eye(2), f)


def timed(*works: Callable[[], object]) -> tuple[list[float], list]:
    """Median times [s] of several runs, taken in turn so that all see the same machine, and the last results."""
    results = [work() for work in works]
    times: list[list[float]] = [[] for _ in works]
    for _ in range(ROUNDS):
        for number, work in enumerate(works):
            start = time.perf_counter()
            results[number] = work()
            times[number].append(time.perf_counter() - start)
    return [median(t) for t in times], results


def analyzer(f: np.ndarray):
    """A noiseless analyzer without leakage."""
    found = random_analyzer(f, rng=np.random.default_rng(11), imperfections=QUIET)
    found.leakage[:] = 0
    return found


def twelve_terms_agree(terms, coefficients: dict) -> float:
    """Largest difference of the terms of both ways."""
    off = 0.0
    for (d, r), way in (((1, 2), "forward"), ((2, 1), "reverse")):
        for name in (
            "directivity",
            "source_match",
            "reflection_tracking",
            "load_match",
            "transmission_tracking",
        ):
            where = {"port_in": d} | ({"port_out": r} if "port_out" in terms[name].dims else {})
            theirs = coefficients[f"{way} {name.replace('_', ' ')}"]
            off = max(off, float(np.abs(terms[name].sel(where).values - theirs).max()))
    return off


def solt() -> tuple[float, float, float]:
    """Times of both, and the largest difference of the error terms."""
    f = np.linspace(50e6, 8e9, POINTS)
    kit, device = load_kit("generic-coax-3p5mm"), analyzer(f)
    readings, measured, ideals = [], [], []
    for name in ONE_PORT:
        both = on_both(kit, name, f)
        raw = device.read(both)
        measured.append(network(raw))
        ideals.append(network(both))
        for p in (1, 2):
            readings.append(Reading(name, (p,), raw.sel(port_out=[p], port_in=[p])))
    raw = device.read(kit.response("thru", f))
    measured.append(network(raw))
    ideals.append(network(kit.response("thru", f)))
    readings.append(Reading("thru", (1, 2), raw))

    def theirs():
        calibration = skrf.calibration.SOLT(measured=measured, ideals=ideals, n_thrus=1)
        return calibration.coefs

    (slow, fast), (coefficients, terms) = timed(theirs, lambda: solve_solt(readings, kit))
    return slow, fast, twelve_terms_agree(terms, coefficients)


def trl() -> tuple[float, float, float]:
    """Times of both, and the largest difference of a corrected part's S-parameters.

    scikit-rf tells the reflect's two roots apart by their squares, which coincide where the line is 90 degrees long:
    the band stops short of that.
    """
    f = np.linspace(1.0e9, 3.6e9, POINTS)
    kit, device = load_kit("demo-board-lines"), analyzer(f)
    device.switch_terms[:] = 0
    connected = {
        "thru": kit.response("thru", f),
        "reflect": on_both(kit, "reflect", f),
        "line": kit.response("line", f),
    }
    raw = {name: device.read(s) for name, s in connected.items()}
    readings = [Reading(name, (1, 2), s) for name, s in raw.items()]
    measured = [network(s) for s in raw.values()]
    ideals = [None, None, network(connected["line"])]
    part = relabel_ports(kit.response("long-line", f), (1, 2)) * 0.8

    def theirs():
        calibration = skrf.calibration.TRL(
            measured=measured, ideals=ideals, estimate_line=False, n_reflects=1
        )
        return calibration.coefs, calibration

    (slow, fast), ((_, calibration), terms) = timed(theirs, lambda: solve_trl(readings, kit))
    read = device.read(part)
    other = calibration.apply_cal(network(read)).s
    return slow, fast, float(np.abs(correct(terms, read).values - other).max())


def main() -> None:
    """Measure, compare, print."""
    rows = []
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        for name, work in (("SOLT, 2 ports", solt), ("TRL", trl)):
            slow, fast, off = work()
            assert off < 1e-9, f"{name}: results differ by {off:.2g}"
            rows.append((name, slow, fast, off))
    print(
        f"deembed {__version__}, scikit-rf {skrf.__version__}, numpy {np.__version__}; {POINTS} points, "
        f"median of {ROUNDS}, OMP_NUM_THREADS={os.environ['OMP_NUM_THREADS']}, {os.cpu_count()} cores\n"
    )
    print("| solver | scikit-rf [ms] | deembed [ms] | ratio | largest difference |")
    print("|---|---|---|---|---|")
    for name, slow, fast, off in rows:
        print(f"| {name} | {slow * 1e3:.0f} | {fast * 1e3:.1f} | {slow / fast:.0f} | {off:.1e} |")


if __name__ == "__main__":
    main()
