"""The verdict: one sentence, the decision first, every place with a warning in it."""

import numpy as np

from deembed.findings import BlindSpot, Finding
from deembed.labels import sparams
from deembed.physicality import assess, verdict

F = np.linspace(1e9, 5e9, 41)
EXPECT = {"passive": True, "reciprocal": True, "lossless": False}


def redundancy(severity="warning"):
    return Finding(
        "redundancy-thru-1-2-1",
        "redundancy",
        "thru 1-2",
        severity,
        "The thru disagrees.",
        1e9,
        2e9,
        0.1,
        1.5e9,
    )


def of_part(change, expect=EXPECT):
    s = np.full((F.size, 3, 3), 0.2 + 0j)
    change(s)
    return verdict(assess(sparams(s, F), expect=expect)[1], expect=expect)


def test_a_part_with_gain_is_not_believable():
    def change(s):
        s[16:35] *= 1.05 / 0.6
        s[29] *= 1.1 / 1.05

    assert of_part(change) == (
        "Not believable as a passive part between 2.6 and 4.4 GHz: the part would give out up to 10 % more "
        "wave amplitude than it receives (worst at 3.9 GHz)."
    )


def test_a_second_contradiction_joins_the_first_and_gain_gives_the_reason():
    def change(s):
        s[16:35] *= 1.05 / 0.6
        s[5:10, 0, 1] += 0.1

    assert of_part(change) == (
        "Not believable as a passive part between 2.6 and 4.4 GHz: the part would give out up to 5 % more wave "
        "amplitude than it receives (worst at 2.6 GHz); nor as a reciprocal part between 1.5 and 1.9 GHz."
    )


def test_non_reciprocity_alone_names_its_ports():
    def change(s):
        s[5:10, 0, 1] += 0.1

    assert of_part(change).startswith(
        "Not believable as a reciprocal part between 1.5 and 1.9 GHz (part port 1, part port 2): transmission"
    )


def test_good_data_say_what_they_could_not_have_shown():
    sentence = of_part(lambda s: None)
    assert sentence.startswith(
        "Physical as far as these readings can show: passive and reciprocal within the tolerance; what they "
        "could not have shown: "
    )
    assert sentence.count(".") == 1


def test_blind_spots_are_named():
    spots = [BlindSpot("arm-reversed", f"arm {k}", -20.0, "a line", "") for k in (1, 2, 3)]
    spots += [
        BlindSpot("thru-length", "thru 1-2", None, "", ""),
        BlindSpot("slow-drift", "port 1", None, "", ""),
    ]
    assert verdict([], expect=EXPECT, blind_spots=spots).endswith(
        "; what they could not have shown: arm 1, arm 2 or arm 3 being the wrong way round; a wrong length of "
        "thru 1-2; slow drift at port 1."
    )


def test_a_calibration_warning_is_in_the_sentence_with_its_place():
    sentence = verdict([redundancy()], expect=EXPECT)
    assert sentence.startswith("Physical as far as")
    assert "; but look at thru 1-2 (redundancy); " in sentence
    gain = Finding("gain-part-1", "gain", "", "contradiction", "At 3 GHz too much; no.", 3e9, 3e9, 0.1, 3e9)
    sentence = verdict([redundancy(), gain], expect=EXPECT)
    assert sentence == (
        "Not believable as a passive part at 3 GHz: too much; look first at thru 1-2 (redundancy)."
    )


def test_a_contradiction_of_another_kind_is_told_in_its_own_words():
    assert verdict([redundancy("contradiction")], expect=EXPECT) == "Not believable: the thru disagrees."


def test_a_finding_without_a_band_still_makes_a_sentence():
    bare = Finding("gain-part-1", "gain", "", "contradiction", "Too much; a passive part cannot.")
    assert verdict([bare], expect=EXPECT) == "Not believable as a passive part at some frequencies: too much."


def test_few_places_are_named_causes_before_symptoms():
    many = [
        Finding(f"d{k}", "disagreement", f"part port {k}", "warning", "", f0, f0 + 1e9)
        for k in range(1, 6)
        for f0 in (1e9, 3e9)
    ]
    sign = Finding("t", "tracking-sign", "open 2, short 2", "warning", "")
    assert (
        "; but look at open 2, short 2 (tracking sign), then part port 1 (disagreement), and 4 more below;"
        in verdict([*many, sign], expect=EXPECT)
    )


def test_many_bands_are_counted():
    many = [
        Finding(
            f"gain-part-{k}",
            "gain",
            "",
            "contradiction",
            "Too much.",
            k * 1e9,
            k * 1e9 + 1e8,
            0.1 * k,
            k * 1e9,
        )
        for k in range(1, 6)
    ]
    assert verdict(many, expect=EXPECT).startswith(
        "Not believable as a passive part in 5 bands between 1 and 5.1 GHz: too much"
    )


def test_nothing_expected_or_nothing_computed_is_not_called_physical():
    assert of_part(lambda s: None, expect={}).startswith(
        "Not judged, since nothing is expected of the part; what"
    )
    sentence = of_part(lambda s: s.fill(np.nan))
    assert sentence.startswith(
        "Not judged, since no frequency of the part could be computed; but look at the part (missing numbers)"
    )
