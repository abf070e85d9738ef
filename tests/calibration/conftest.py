"""An analyzer made of random error terms, and readings of standards by it."""

from itertools import combinations
from types import SimpleNamespace

import numpy as np
import pytest
import skrf

from deembed.calibration import Reading, predict_raw
from deembed.calibration.error_terms import build_terms
from deembed.labels import relabel_ports, sparams
from deembed.numeric.error_terms import Terms

ONE_PORT = ("open", "short", "load")


def disk(rng, shape, radius=0.9):
    """Random reflections up to a radius."""
    return radius * np.sqrt(rng.uniform(size=shape)) * np.exp(2j * np.pi * rng.uniform(size=shape))


def tracking(rng, shape):
    """Random tracking, 0.3 to 1.5, any phase."""
    return rng.uniform(0.3, 1.5, shape) * np.exp(2j * np.pi * rng.uniform(size=shape))


def random_terms(rng, f, ports, *, leading=(), isolation=False):
    """Error terms drawn independently at every frequency; `leading` is (name, size) pairs."""
    shape, n = (*(size for _, size in leading), f.size), len(ports)
    leak = disk(rng, (*shape, n, n), 0.1) if isolation else np.zeros((*shape, n, n))
    plain = Terms(
        disk(rng, (*shape, n)),
        disk(rng, (*shape, n)),
        tracking(rng, (*shape, n)),
        disk(rng, (*shape, n, n)),
        tracking(rng, (*shape, n, n)),
        leak,
    )
    coords = {"frequency": f} | {name: np.arange(size) for name, size in leading}
    dims = (*(name for name, _ in leading), "frequency")
    return build_terms(plain, ports=ports, coords=coords, dims=dims, z0=50.0, method="drawn")


def random_part(rng, f, ports, *, leading=()):
    """A random part that would give out up to 0.98 of the wave it receives."""
    shape, n = (*(size for _, size in leading), f.size), len(ports)
    s = disk(rng, (*shape, n, n))
    s *= rng.uniform(0.2, 0.98, (*shape, 1, 1)) / np.linalg.norm(s, 2, axis=(-2, -1))[..., None, None]
    return sparams(s, f, ports=ports, leading=[name for name, _ in leading])


def read(terms, kit, standard, ports):
    """One reading of a standard of a kit."""
    response = kit.response(standard, terms.frequency.values)
    return Reading(standard, tuple(ports), predict_raw(terms, relabel_ports(response, ports)))


def one_port_readings(terms, kit, ports, standards=ONE_PORT):
    """Each standard at each port, alone."""
    return [read(terms, kit, standard, [p]) for p in ports for standard in standards]


def solt_readings(terms, kit, ports, *, standards=ONE_PORT, thru="thru", isolation=False):
    """Everything that solve_solt needs."""
    readings = one_port_readings(terms, kit, ports, standards)
    f = terms.frequency.values
    for pair in combinations(ports, 2):
        readings.append(read(terms, kit, thru, pair))
        if isolation:
            nothing = sparams(np.zeros((f.size, 2, 2)), f, ports=pair)
            readings.append(Reading("isolation", pair, predict_raw(terms, nothing)))
    return readings


def worst(a, b):
    """Largest difference of two labelled arrays, aligned by label; NaN on both sides is no difference."""
    difference = abs(a - b).values
    np.testing.assert_array_equal(np.isnan(difference), np.isnan((a + 0 * b).values))
    return float(np.nanmax(difference))


def network(f, s):
    """A network of scikit-rf in 50 ohm."""
    return skrf.Network(frequency=skrf.Frequency.from_f(f, unit="Hz"), s=np.asarray(s), z0=50)


@pytest.fixture(scope="session")
def bench():
    """The functions above."""
    return SimpleNamespace(
        disk=disk,
        tracking=tracking,
        random_terms=random_terms,
        random_part=random_part,
        read=read,
        one_port_readings=one_port_readings,
        solt_readings=solt_readings,
        worst=worst,
        network=network,
    )
