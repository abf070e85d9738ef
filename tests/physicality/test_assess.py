"""Findings about a part: what counts, where, how large, and in which words."""

import numpy as np
import pytest

from deembed.errors import JobError
from deembed.labels import sparams
from deembed.networks import renormalize
from deembed.physicality import assess

F = np.linspace(1e9, 5e9, 41)
PASSIVE = {"passive": True, "reciprocal": True}


def part(change=None, n=3):
    """A lossy reciprocal part; `change(s)` edits it in place."""
    s = np.full((F.size, n, n), 0.2 + 0j)
    if change:
        change(s)
    return sparams(s, F)


def kinds(findings, severity="contradiction"):
    return [f.kind for f in findings if f.severity == severity]


def test_gain_is_said_with_band_size_and_place():
    def change(s):
        s[16:35] *= 1.05 / 0.6
        s[29] *= 1.1 / 1.05

    _, findings = assess(part(change), expect=PASSIVE)
    gain = findings[0]
    assert (gain.kind, gain.severity, gain.where, gain.id) == ("gain", "contradiction", "", "gain-part-1")
    assert (gain.from_hz, gain.to_hz, gain.worst_hz) == (2.6e9, 4.4e9, 3.9e9)
    assert gain.worst == pytest.approx(0.1)
    assert gain.text == (
        "Between 2.6 and 4.4 GHz the part would give out up to 10 % more wave amplitude than it receives "
        "(worst at 3.9 GHz); a passive part cannot."
    )


def test_gain_within_the_tolerance_is_no_finding():
    def change(s):
        s *= 1.0099 / 0.6

    assert kinds(assess(part(change), expect=PASSIVE)[1]) == []
    assert kinds(assess(part(change), expect=PASSIVE, tolerance=0.005)[1]) == ["gain"]
    assert kinds(assess(part(change), expect=PASSIVE, tolerance={"match": 0.005})[1]) == []


def test_a_drive_that_alone_gives_out_too_much_is_named():
    def change(s):
        s[:, 1, 1] = 1.1

    _, findings = assess(part(change), expect={"passive": True})
    (power,) = [f for f in findings if f.kind == "power-balance"]
    assert power.where == "part port 2" and power.worst == pytest.approx(1.21 + 0.08 - 1)
    assert "waves into part port 2 alone would come out with up to 29 % more power" in power.text


def test_non_reciprocity_is_named_by_port_pair():
    def change(s):
        s[10:21, 2, 0] += 0.05

    _, findings = assess(part(change), expect=PASSIVE)
    (finding,) = [f for f in findings if f.severity == "contradiction"]
    assert (finding.kind, finding.where) == ("non-reciprocity", "part port 1, part port 3")
    assert (finding.from_hz, finding.to_hz) == (2e9, 3e9)
    assert finding.text.startswith(
        "Between 2 and 3 GHz transmission from part port 1 to 3 and back differs by a wave amplitude of up "
        "to 0.05 (worst at 2"
    )


def test_loss_contradicts_lossless():
    _, findings = assess(part(n=2), expect={"lossless": True})
    (finding,) = findings
    assert finding.kind == "lossless" and finding.worst == pytest.approx(1.0)
    assert "a lossless part gives all of it back" in finding.text


@pytest.mark.parametrize(
    ("amplitude", "judged"), [(0.992, False), (0.985, True), (1.008, False), (1.015, True)]
)
def test_the_tolerance_is_a_wave_amplitude_for_power_too(amplitude, judged):
    """One per cent of amplitude is two of power: 0.992 and 1.008 pass, 0.985 and 1.015 do not."""
    through = sparams(np.broadcast_to(amplitude * np.array([[0, 1], [1, 0]]), (F.size, 2, 2)), F)
    metrics, findings = assess(through, expect={"passive": True, "lossless": True})
    assert bool(metrics.holds.sel(property="lossless").all()) != judged
    assert ("lossless" in kinds(findings)) == judged
    assert ("power-balance" in kinds(findings)) == ("gain" in kinds(findings)) == (judged and amplitude > 1)


def test_what_is_not_expected_is_not_judged():
    def change(s):
        s *= 2
        s[:, 0, 1] = 0

    metrics, findings = assess(part(change), expect={})
    assert kinds(findings) == [] and metrics.largest_singular_value.max() > 1
    assert kinds(assess(part(change))[1]) == []
    assert (
        kinds(assess(part(change), expect=dict.fromkeys(("passive", "reciprocal", "lossless"), False))[1])
        == []
    )


def test_a_part_that_is_what_it_should_not_be_is_a_note():
    notes = [
        f for f in assess(part(), expect={"reciprocal": False, "passive": False})[1] if f.severity == "note"
    ]
    texts = [f.text for f in notes if f.kind.startswith("unexpectedly")]
    assert texts == [
        "The part is expected not to be passive, but within the tolerance it never gives out more than it "
        "receives.",
        "The part is expected not to be reciprocal, but within the tolerance it transmits alike both ways "
        "everywhere.",
    ]


def test_many_narrow_bands_become_two_that_say_they_are_patchy():
    def change(s):
        s[::5] *= 1.2 / 0.6

    gains = [f for f in assess(part(change), expect={"passive": True})[1] if f.kind == "gain"]
    assert len(gains) == 1
    assert "(worst at 1 GHz, seen at 22 % of the points)" in gains[0].text


def test_leading_dims_are_judged_at_their_worst_and_it_is_said():
    s = np.broadcast_to(part().values, (5, F.size, 3, 3)).copy()
    s[3, 7] *= 2
    metrics, findings = assess(sparams(s, F, leading=("draw",)), expect={"passive": True})
    assert metrics.largest_singular_value.dims == ("draw", "frequency")
    assert findings[0].text.startswith("At 1.7 GHz") and "(worst of 5 along draw)" in findings[0].text


def test_points_that_are_not_numbers_are_named():
    def change(s):
        s[3] = s[8] = np.nan
        s[20] *= 4

    _, findings = assess(part(change), expect=PASSIVE)
    assert (
        kinds(findings) == ["gain", "power-balance", "power-balance", "power-balance"]
        and findings[0].from_hz == 3e9
    )
    (missing,) = [f for f in findings if f.kind == "missing"]
    assert missing.severity == "warning" and missing.where == ""
    assert missing.text.startswith(
        "At 2 frequencies (1.3 GHz, 1.8 GHz) the part is not a number; these points"
    )


def test_an_undriven_port_is_named():
    def change(s):
        s[:, :, 1] = np.nan

    (missing, *_) = assess(part(change), expect=PASSIVE)[1]
    assert (missing.kind, missing.where) == ("not-judged", "part port 2")
    assert missing.text.startswith("No frequency could be judged: at 41 frequencies")


def test_complex_reference_impedance_is_said_and_raises_no_false_alarm():
    s = np.zeros((F.size, 2, 2), dtype=complex)
    s[:, 0, 1] = s[:, 1, 0] = 1.0
    written = renormalize(sparams(s, F), np.array([50 + 40j, 30 - 20j]))
    assert np.abs(written[0, 0, 1] - written[0, 1, 0]) > 0.1
    _, findings = assess(written, expect=PASSIVE | {"lossless": True})
    assert [f.kind for f in findings] == ["reference-impedance"]
    assert "imaginary part up to 40 ohm" in findings[0].text


@pytest.mark.parametrize("n", [1, 2, 4, 6])
def test_parts_of_any_number_of_ports(n):
    metrics, findings = assess(part(lambda s: s.__imul__(3), n=n), expect=PASSIVE)
    assert metrics.largest_singular_value.values == pytest.approx(0.6 * n)
    assert ("gain" in kinds(findings)) == (n > 1)


@pytest.mark.parametrize(
    ("expect", "message"),
    [
        ({"pasive": True}, "expect: unknown expectation 'pasive'. Did you mean 'passive'"),
        ({"cheap": True}, "unknown expectation 'cheap'. Known are passive, reciprocal and lossless"),
        ({"passive": "yes"}, "'passive' is 'yes'. Give true or false"),
    ],
)
def test_unknown_expectations_are_refused(expect, message):
    with pytest.raises(JobError, match=message):
        assess(part(), expect=expect)
