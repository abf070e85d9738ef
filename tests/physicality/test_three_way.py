"""The three-way law on random and ideal three-ports."""

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from deembed.labels import sparams
from deembed.physicality import assess

F = np.linspace(1e9, 5e9, 41)
CIRCULATOR = np.array([[0, 0, 1], [1, 0, 0], [0, 1, 0]], dtype=complex)


def constant(matrix):
    return sparams(np.broadcast_to(matrix, (F.size, 3, 3)), F)


@settings(derandomize=True, deadline=None, max_examples=30)
@given(seed=st.integers(0, 2**32 - 1), largest=st.floats(0.1, 1))
def test_reciprocal_passive_parts_keep_the_law_and_lose_at_least_the_floor(seed, largest):
    rng = np.random.default_rng(seed)
    a = rng.normal(size=(F.size, 3, 3)) + 1j * rng.normal(size=(F.size, 3, 3))
    s = a + a.swapaxes(1, 2)
    s *= largest / np.linalg.norm(s, 2, axis=(1, 2))[:, None, None]
    metrics, findings = assess(sparams(s, F), expect={"passive": True, "reciprocal": True})
    assert metrics.three_way_slack.min() > -1e-12
    assert (metrics.dissipation - metrics.dissipation_floor).min() > -1e-12
    assert {f.severity for f in findings} <= {"note"}


def test_a_lossless_matched_part_breaks_the_law_of_reciprocal_parts():
    findings = assess(constant(CIRCULATOR), expect={"reciprocal": True})[1]
    (law,) = [f for f in findings if f.kind == "three-way"]
    assert law.severity == "contradiction" and abs(law.worst - 1) < 1e-12
    assert "add up to 1 less (worst at 1 GHz) than any reciprocal three-port" in law.text
    assert not [f for f in assess(constant(CIRCULATOR), expect={})[1] if f.kind == "three-way"]


def test_data_that_claim_all_three_are_refused_whatever_is_expected():
    nearly = constant(0.5 * (CIRCULATOR + CIRCULATOR.T))  # reciprocal and matched, not lossless
    tolerance = {"lossless": 0.5, "match": 0.1}
    for expect, severity in (({"reciprocal": True}, "contradiction"), ({}, "warning")):
        (law,) = [f for f in assess(nearly, expect=expect, tolerance=tolerance)[1] if f.kind == "three-way"]
        assert law.severity == severity
        assert law.where == "part port 1, part port 2, part port 3"
        assert (
            "looks matched, reciprocal and lossless at once within the tolerances; no three-port can"
            in law.text
        )


def test_a_note_says_which_properties_hold_and_where():
    s = np.broadcast_to(0.5 * (CIRCULATOR + CIRCULATOR.T), (F.size, 3, 3)).copy()
    s[21:, 0, 0] = 0.3
    s[::2, 0, 1] += 0.1
    (note,) = [f for f in assess(sparams(s, F))[1] if f.kind == "holds"]
    assert note.severity == "note"
    assert note.text == (
        "Within the tolerances the part is matched between 1 and 3 GHz (at 51 % of the frequencies), "
        "reciprocal at 49 % of the frequencies and lossless nowhere; a three-port can be any two of matched, "
        "reciprocal and lossless, never all three."
    )


def test_the_floor_is_said_only_of_reciprocal_points():
    assert not [f for f in assess(constant(CIRCULATOR))[1] if f.kind == "dissipation-floor"]
    (note,) = [
        f for f in assess(constant(0.5 * (CIRCULATOR + CIRCULATOR.T)))[1] if f.kind == "dissipation-floor"
    ]
    assert note.worst == 1 / 3
    assert (
        "must lose at least 33 % of the power inside, averaged over its ports; these readings lose 50 %"
        in note.text
    )
    (note,) = [
        f for f in assess(constant(0.8 * (CIRCULATOR + CIRCULATOR.T)))[1] if f.kind == "dissipation-floor"
    ]
    assert "these readings gain 28 %" in note.text


def test_the_floor_is_reached_at_every_match():
    """A through between two ports and a third that only reflects m: its values are 1, 1, m."""
    for m in (0.0, 0.3, 0.8, 1.0):
        metrics, _ = assess(constant([[0, 1, 0], [1, 0, 0], [0, 0, m]]))
        np.testing.assert_allclose(metrics.dissipation_floor, (1 - m * m) / 3, atol=1e-12)
        np.testing.assert_allclose(metrics.dissipation, metrics.dissipation_floor, atol=1e-12)
        np.testing.assert_allclose(metrics.three_way_slack, 0, atol=1e-12)


def test_parts_that_are_not_three_ports_and_empty_data_say_nothing():
    assert assess(sparams(np.zeros((41, 2, 2)), F))[1] == []
    assert [f.kind for f in assess(constant(np.nan * CIRCULATOR))[1]] == ["not-judged"]
