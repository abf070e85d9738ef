"""Labelled rounds to a labelled part: numbers, labels, findings and every refusal."""

import numpy as np
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from deembed.errors import DeembedError, GridError, PortError, SolveError
from deembed.labels import select_ports, sparams
from deembed.networks import close_ports, renormalize
from deembed.threeport import assemble

F = np.linspace(1e9, 5e9, 41)
CYCLIC = ([1, 2], [2, 3], [3, 1])


def random_part(rng, n=3, lead=(), z0=50.0, leading=None):
    a = rng.normal(size=(*lead, F.size, n, n)) + 1j * rng.normal(size=(*lead, F.size, n, n))
    return sparams(a / (2 * n), F, z0=z0, leading=leading)


def reflection(rng, size):
    return xr.DataArray(
        size * np.exp(1j * rng.uniform(0, 6, F.size)), dims="frequency", coords={"frequency": F}
    )


def rounds_of(part, terminations, pairs=CYCLIC):
    ports = part.port_out.values.tolist()
    return [
        select_ports(close_ports(part, {p: terminations.get(p, 0) for p in ports if p not in pair}), pair)
        for pair in pairs
    ]


@settings(derandomize=True, deadline=None, max_examples=25)
@given(seed=st.integers(0, 2**32 - 1), size=st.floats(0, 0.9))
def test_three_ports_from_two_with_known_terminations(seed, size):
    rng = np.random.default_rng(seed)
    part = random_part(rng)
    g = {p: reflection(rng, size) for p in (1, 2, 3)}
    got = assemble(rounds_of(part, g), terminations=g, part_ports=3)
    assert abs(got.part - part).max() < 1e-11
    assert abs(got.disagreement).max() < 1e-11
    assert got.findings == ()


def test_labels_of_the_result():
    rng = np.random.default_rng(1)
    got = assemble(rounds_of(random_part(rng), {}))
    assert got.part.dims == ("frequency", "port_out", "port_in")
    assert got.part.port_out.values.tolist() == [1, 2, 3]
    assert got.disagreement.dims == ("round", "frequency", "port")
    assert got.disagreement["round"].values.tolist() == ["1-2", "2-3", "3-1"]
    unread = np.isnan(got.disagreement).all("frequency")
    assert unread.values.tolist() == [[False, False, True], [True, False, False], [False, True, False]]


def test_six_ports_from_pairs_with_terminations_different_in_every_round():
    rng = np.random.default_rng(2)
    part = random_part(rng, n=6)
    pairs = [(a, b) for a in range(1, 7) for b in range(a + 1, 7)]
    given_each = [{p: reflection(rng, 0.18) for p in range(1, 7)} for _ in pairs]
    rounds = [rounds_of(part, g, [list(pair)])[0] for g, pair in zip(given_each, pairs, strict=True)]
    got = assemble(rounds, terminations=given_each, part_ports=6)
    assert abs(got.part - part).max() < 1e-9
    (note,) = got.findings
    assert note.severity == "note" and "different terminations in different rounds" in note.text


def test_rounds_of_three_ports_of_a_five_port_average_what_is_read_again():
    rng = np.random.default_rng(3)
    part = random_part(rng, n=5)
    triples = [[1, 2, 3], [1, 4, 5], [2, 3, 4], [2, 3, 5]]
    got = assemble(rounds_of(part, {}, triples), part_ports=5)
    assert abs(got.part - part).max() < 1e-12 and got.findings == ()
    rounds = rounds_of(part, {}, triples)
    rounds[0] = rounds[0].copy()
    rounds[0].loc[{"port_out": 3, "port_in": 2}] += 0.3
    got = assemble(rounds, part_ports=5)
    places = {f.where for f in got.findings}
    assert "round 1-2-3, part port 2, part port 3" in places
    np.testing.assert_allclose((got.part - part).sel(port_out=3, port_in=2), 0.1, atol=1e-12)


def test_one_round_with_all_ports_passes_unchanged():
    part = random_part(np.random.default_rng(4), lead=(2,))
    got = assemble([select_ports(part, [3, 1, 2])])
    xr.testing.assert_identical(got.part, part)
    assert np.isnan(got.disagreement).all() and got.findings == ()


def test_a_one_port_part_is_a_round_of_its_own():
    part = random_part(np.random.default_rng(4), n=1)
    xr.testing.assert_identical(assemble([part], part_ports=1).part, part)


def test_leading_dims_meet_by_name():
    rng = np.random.default_rng(5)
    part = random_part(rng, lead=(3,), leading=("draw",)).assign_coords(draw=[10, 20, 30])
    size = xr.DataArray([0.1, 0.7], dims="hypothesis")
    g = {p: reflection(rng, 1.0) * size for p in (1, 2, 3)}
    got = assemble(rounds_of(part, g), terminations=g)
    assert set(got.part.dims[:2]) == {"draw", "hypothesis"}
    assert got.part.draw.values.tolist() == [10, 20, 30]
    assert abs(got.part - part).max() < 1e-12
    assert got.disagreement.sizes["hypothesis"] == 2


def test_leading_dims_of_different_size_are_refused():
    rng = np.random.default_rng(6)
    rounds = rounds_of(random_part(rng, lead=(3,)), {})
    rounds[1] = rounds[1].isel(draw=slice(2))
    with pytest.raises(DeembedError, match="3 and 2 entries along 'draw'"):
        assemble(rounds)
    rounds[1] = rounds_of(random_part(rng, lead=(3,)).assign_coords(draw=[7, 8, 9]), {})[1]
    rounds[0] = rounds[0].assign_coords(draw=[0, 1, 2])
    with pytest.raises(DeembedError, match="labels along 'draw' differ"):
        assemble(rounds)


def test_terminations_come_as_numbers_arrays_or_one_ports_in_their_own_impedance():
    rng = np.random.default_rng(7)
    part = random_part(rng, z0=[50.0, 75.0, 50.0 + 5j])
    at_port = sparams(np.full((F.size, 1, 1), 0.3 - 0.2j), F, ports=[2], z0=75.0)
    in_50 = renormalize(at_port, 50.0)
    g = {1: 0.5j, 2: at_port, 3: reflection(rng, 0.4)}
    rounds = rounds_of(part, {**g, 2: 0.3 - 0.2j})
    got = assemble(rounds, terminations={**g, 2: in_50})
    assert abs(got.part - part).max() < 1e-12
    np.testing.assert_array_equal(got.part.z0.values, [50, 75, 50 + 5j])


def test_impedance_over_frequency_is_kept():
    rng = np.random.default_rng(8)
    z0 = 50 + 5j * np.linspace(0, 1, F.size)[:, None] * np.array([1, 2, 3])
    part = random_part(rng, z0=z0)
    got = assemble(rounds_of(part, {}))
    np.testing.assert_array_equal(got.part.z0.transpose("frequency", "port_out").values, z0)


def test_disagreement_is_named_with_rounds_port_band_and_worst():
    rounds = rounds_of(random_part(np.random.default_rng(9)), {})
    rounds[0] = rounds[0].copy()
    rounds[0][10:21, 0, 0] += 0.1
    rounds[0][15, 0, 0] += 0.1
    got = assemble(rounds)
    (finding,) = got.findings
    assert (finding.kind, finding.severity) == ("disagreement", "warning")
    assert finding.where == "round 1-2, round 3-1, part port 1"
    assert (finding.from_hz, finding.to_hz, finding.worst_hz) == (2e9, 3e9, 2.5e9)
    assert finding.worst == pytest.approx(0.1)
    assert finding.text.startswith(
        "Between 2 and 3 GHz the reflection of part port 1 read in rounds 1-2 and 3-1"
    )
    offset = got.disagreement.sel(frequency=2e9, port=1)
    np.testing.assert_allclose(offset.sel(round=["1-2", "3-1"]), [0.05, -0.05], atol=1e-14)
    assert assemble(rounds, disagreement_limit=0.11).findings == ()


def test_disagreement_of_three_readings_names_each_round_alone():
    part = random_part(np.random.default_rng(10), n=4)
    rounds = rounds_of(part, {}, [[1, 2], [1, 3], [1, 4], [2, 3], [2, 4], [3, 4]])
    rounds[0] = rounds[0].copy()
    rounds[0][:, 0, 0] += 0.06
    assert {(f.where, round(f.worst, 9)) for f in assemble(rounds).findings} == {
        ("round 1-2, part port 1", 0.04),
        ("round 1-3, part port 1", 0.02),
        ("round 1-4, part port 1", 0.02),
    }


def test_readings_that_are_not_numbers_leave_the_part_empty_and_are_named():
    rng = np.random.default_rng(11)
    part, g = random_part(rng), {3: reflection(rng, 0.3), 2: reflection(rng, 0.2)}
    rounds = rounds_of(part, g)
    rounds[1] = rounds[1].copy()
    rounds[1][4] = np.nan
    g[3] = g[3].copy()
    g[3][7] = np.nan
    got = assemble(rounds, terminations=g)
    empty = np.isnan(got.part).any(["port_out", "port_in"])
    assert np.flatnonzero(empty).tolist() == [4, 7]
    assert [f.where for f in got.findings if f.kind == "missing"] == ["round 2-3", "termination 3"]
    assert "At 1 frequency (1.4 GHz) round 2-3 is missing or not a number" in got.findings[0].text
    assert not [f for f in got.findings if f.kind == "assembly"]


def test_frequencies_without_a_solution_are_empty_and_named():
    """A port that reflects everything, closed with an ideal open: what it does there nobody can read."""
    rng = np.random.default_rng(12)
    part = random_part(rng)
    g = {
        3: xr.DataArray(np.where(np.arange(F.size) == 5, 1.0, 0.2), dims="frequency", coords={"frequency": F})
    }
    part[5, 2, :2] = part[5, :2, 2] = 0.0
    part[5, 2, 2] = 1.0
    rounds = [*rounds_of(part, {}, [[1, 2]]), *rounds_of(part, {}, [[2, 3], [3, 1]])]
    rounds[0] = rounds_of(part.where(part.frequency != F[5], 0), g, [[1, 2]])[0]
    got = assemble(rounds, terminations=g)
    (finding,) = [f for f in got.findings if f.severity == "warning"]
    assert finding.kind == "assembly" and "At 1 frequency (1.5 GHz) no part fits" in finding.text
    assert np.flatnonzero(np.isnan(got.part).any(["port_out", "port_in"])).tolist() == [5]


def test_a_termination_that_gives_out_more_than_it_receives_is_a_warning():
    rng = np.random.default_rng(13)
    g = {3: xr.DataArray(np.where(F > 4e9, 1.2, 0.2), dims="frequency", coords={"frequency": F})}
    got = assemble(rounds_of(random_part(rng), g), terminations=g)
    (finding,) = [f for f in got.findings if f.kind == "termination"]
    assert (finding.where, finding.severity, finding.worst) == ("termination 3", "warning", 1.2)
    assert "termination 3 reflects up to 1.2 of the wave" in finding.text and finding.from_hz == 4.1e9


def test_a_termination_no_round_needed_is_a_note():
    got = assemble([random_part(np.random.default_rng(14))], terminations={2: 0.1})
    (finding,) = got.findings
    assert (finding.where, finding.severity) == ("termination 2", "note")
    assert "part port 2 was not used" in finding.text


PART = random_part(np.random.default_rng(15))
ROUNDS = rounds_of(PART, {})
REFUSED = {
    "no rounds": ({"rounds": []}, PortError, "no rounds came. Measure round 1-2 first"),
    "port never read": (
        {"rounds": ROUNDS[:1], "part_ports": 3},
        PortError,
        "part port 3 was never read. Measure round 1-3 next",
    ),
    "pair never read": (
        {"rounds": ROUNDS[:2], "part_ports": 3},
        PortError,
        "pair 1-3 of part ports was never read together. Measure round 1-3 next",
    ),
    "same pair twice": (
        {"rounds": [*ROUNDS, select_ports(ROUNDS[0], [2, 1])]},
        SolveError,
        r"two rounds read part ports 1 and 2: round 1-2 \(number 1\) and round 2-1 \(number 4\)",
    ),
    "port beyond the part": (
        {"rounds": ROUNDS, "part_ports": 2},
        PortError,
        "round 2-3: part port 3 does not exist; the part has 2 ports",
    ),
    "unknown termination": (
        {"rounds": ROUNDS, "terminations": {4: 0.1}},
        PortError,
        "termination 4: the part has no port 4; it has ports 1, 2 and 3",
    ),
    "terminations of other count": (
        {"rounds": ROUNDS, "terminations": [{1: 0.1}]},
        PortError,
        "1 sets of terminations for 3 rounds",
    ),
    "two-port termination": (
        {"rounds": ROUNDS, "terminations": {3: ROUNDS[0]}},
        PortError,
        "termination 3: 2 ports came; needed one",
    ),
    "plain array": ({"rounds": [np.zeros((3, 3))]}, DeembedError, r"round \?: a ndarray came"),
    "other grid": (
        {"rounds": [*ROUNDS[:2], ROUNDS[2].isel(frequency=slice(40))]},
        GridError,
        "round 1-2 has 41 points, 1 GHz to 5 GHz; round 3-1 has 40 points, 1 GHz to 4.9 GHz",
    ),
    "termination on another grid": (
        {"rounds": ROUNDS, "terminations": {1: reflection(np.random.default_rng(0), 0.1)[:9]}},
        GridError,
        "each round has 41 points.*termination 1 has 9 points",
    ),
    "impedances that differ": (
        {"rounds": [*ROUNDS[:2], renormalize(ROUNDS[2], 75.0)]},
        DeembedError,
        "reference impedance of part port 1: round 1-2 has 50 ohm, round 3-1 has 75 ohm",
    ),
}


@pytest.mark.parametrize("case", REFUSED, ids=str)
def test_what_cannot_be_assembled_is_refused_in_words(case):
    arguments, error, message = REFUSED[case]
    with pytest.raises(error, match=message):
        assemble(**arguments)
