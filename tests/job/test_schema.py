"""A job file is checked key by key, and every message says file, line, key, value and what to do."""

from __future__ import annotations

import re

import pytest

from deembed.errors import JobError
from deembed.job.places import line_of, parse_path, path_words
from deembed.job.schema import FrozenMap, plain, tolerance_of
from deembed.job.validate import validate

GOOD = """\
[job]
title = "Bench"
part_ports = 3

[analyzer]
ports = 2
drive = "every-port"

[calibration]
method = "solt"
kit = "ideal"
[[calibration.readings]]
standard = "open"
ports = [1]
file = "raw/open_1.s1p"

[[rounds]]
file = "raw/part_12.s2p"
analyzer_ports = [1, 2]
part_ports = [1, 2]

[[rounds]]
file = "raw/part_23.s2p"
analyzer_ports = [1, 2]
part_ports = [2, 3]

[[rounds]]
file = "raw/part_31.s2p"
analyzer_ports = [1, 2]
part_ports = [3, 1]

[terminations]
3 = "raw/termination_3.s1p"

[[fixture.arms]]
part_port = 1
file = "fixture/arm_1.s2p"
analyzer_side = 1

[expect]
passive = true
"""


def refuse(text: str, message: str) -> None:
    """The whole message, line number included."""
    with pytest.raises(JobError, match=f"^{re.escape(message)}$"):
        validate(text)


def test_a_good_job_holds_tuples_and_read_only_maps() -> None:
    spec = validate(GOOD)
    assert spec.rounds[2].part_ports == (3, 1)
    assert spec.terminations[3] == "raw/termination_3.s1p"
    assert spec.analyzer.switch_terms == FrozenMap()
    assert spec.expect.claims() == {"passive": True}
    with pytest.raises(Exception, match="frozen"):
        spec.job.part_ports = 2  # type: ignore[misc]
    with pytest.raises(TypeError, match="does not support item assignment"):
        spec.terminations[2] = "x"
    assert hash(spec) == hash(validate(GOOD))
    assert plain(spec)["terminations"] == {"3": "raw/termination_3.s1p"}


def test_free_words_may_be_dates_and_numbers() -> None:
    spec = validate(GOOD.replace('title = "Bench"', "kit_due = 2027-03-01\ntemperature_c = 23.5"))
    assert (spec.job.kit_due, spec.job.temperature_c) == ("2027-03-01", "23.5")


def test_seats_follow_the_analyzer_ports() -> None:
    spec = validate(
        GOOD.replace(
            "analyzer_ports = [1, 2]\npart_ports = [3, 1]", "analyzer_ports = [2, 1]\npart_ports = [3, 1]"
        )
    )
    assert spec.rounds[2].seats() == (1, 3)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            "part_ports = 3",
            "part_portz = 3",
            "job.toml, line 3, job.part_portz: unknown key 'part_portz'. Did you mean part_ports? Known "
            "here: title, "
            "part_ports, reference_impedance_ohm, interpolate, operator, instrument, kit_serial, kit_due, "
            "temperature_c, note",
        ),
        (
            "analyzer_side = 1",
            "analyser_side = 1",
            "job.toml, line 38, fixture.arms[0].analyser_side: unknown key 'analyser_side'. Did you mean "
            "analyzer_side? Known here: part_port, file, analyzer_side",
        ),
        (
            "[expect]",
            "[expects]",
            "job.toml, line 40, expects: unknown key 'expects'. Did you mean expect? Known in a job file: "
            "job, "
            "analyzer, calibration, rounds, terminations, checks, fixture, expect",
        ),
        (
            "[expect]",
            '[[adjustments]]\ncause = "arm-reversed"\n\n[expect]',
            "job.toml, line 40, adjustments: unknown key 'adjustments'. Known in a job file: job, analyzer, "
            "calibration, rounds, terminations, checks, fixture, expect",
        ),
        (
            "part_ports = 3",
            'part_ports = "3"',
            "job.toml, line 3, job.part_ports: '3' came; needed a whole number",
        ),
        ("passive = true", "passive = 1", "job.toml, line 41, expect.passive: 1 came; needed true or false"),
        (
            "passive = true",
            "tolerance = -0.01",
            "job.toml, line 41, expect.tolerance: is -0.01; needed a wave amplitude above 0 and below 1, "
            "such as 0.01",
        ),
        (
            "passive = true",
            "tolerance = { gian = 0.1 }",
            "job.toml, line 41, expect.tolerance: has the key 'gian'; its keys are gain, reciprocity, "
            "lossless, "
            "match, three_way",
        ),
        (
            'drive = "every-port"',
            'drive = "every-prot"',
            "job.toml, line 7, analyzer.drive: 'every-prot' came; needed 'every-port' or 'first-port-only' "
            "(nearest: every-port)",
        ),
        (
            'method = "solt"',
            'method = "slot"',
            "job.toml, line 10, calibration.method: unknown method 'slot'. Did you mean solt? "
            "Known: none, sol, solt, trl.",
        ),
        (
            'method = "solt"',
            'method = "sol"',
            "job.toml, line 10, calibration.method: 'sol' corrects reflections alone, and the part has 3 "
            "ports. "
            "Use solt or trl, or set job.part_ports = 1.",
        ),
        (
            'method = "solt"\nkit = "ideal"',
            'method = "solt"',
            "job.toml, line 9, calibration: method 'solt' needs a kit and none is named. "
            'Add kit = "a name in standards_defs" or the path of a kit file.',
        ),
        (
            'method = "solt"',
            'method = "none"',
            "job.toml, line 12, calibration.readings[0]: readings of standards came with method 'none', "
            "which uses "
            "none. Remove them, or name the method that they belong to.",
        ),
        (
            "ports = [1]",
            "ports = [3]",
            "job.toml, line 14, calibration.readings[0].ports: [3] names analyzer port 3, but the analyzer "
            "has "
            "2 ports. Correct it, or analyzer.ports.",
        ),
        (
            "part_ports = [3, 1]",
            "part_ports = [2, 1]",
            "job.toml, line 30, rounds[2].part_ports: two rounds for the same part ports 2-1: "
            "raw/part_12.s2p "
            "(rounds[0]) and raw/part_31.s2p. Keep one of them, or correct part_ports.",
        ),
        (
            "part_ports = [3, 1]",
            "part_ports = [3, 4]",
            "job.toml, line 30, rounds[2].part_ports: [3, 4] names part port 4, but the part has 3 ports. "
            "Correct it, or job.part_ports.",
        ),
        (
            "part_ports = [3, 1]",
            "part_ports = [3]",
            "job.toml, line 30, rounds[2].part_ports: [3] came for analyzer_ports [1, 2]. "
            "Name one part port per analyzer port, in the same order.",
        ),
        (
            "part_ports = [3, 1]",
            "part_ports = [3, 3]",
            "job.toml, line 30, rounds[2].part_ports: [3, 3] names a port twice. Name each port once.",
        ),
        (
            "part_ports = 3",
            "part_ports = 4",
            "job.toml, line 17, rounds: part port 4 is never read; the rounds are 1-2, 2-3 and 3-1. "
            "Add rounds that read every pair of part ports.",
        ),
        (
            '3 = "raw/termination_3.s1p"',
            '4 = "raw/termination_4.s1p"',
            "job.toml, line 33, terminations.4: a termination for part port 4, but the part has 3 ports. "
            "Correct the port or job.part_ports.",
        ),
        (
            '3 = "raw/termination_3.s1p"',
            'third = "raw/termination_3.s1p"',
            "job.toml, line 32, terminations: has the key 'third'; its keys are port numbers from 1",
        ),
        (
            "part_ports = [3, 1]",
            'part_ports = [3, 1]\nterminations = { 1 = "raw/other.s1p" }',
            "job.toml, line 31, rounds[2].terminations.1: a termination at part port 1, which this round "
            "reads. "
            "Only ports that the round leaves free are terminated.",
        ),
        (
            "part_port = 1",
            "part_port = 4",
            "job.toml, line 36, fixture.arms[0].part_port: an arm for part port 4, but the part has 3 ports. "
            "Correct the port or job.part_ports.",
        ),
        (
            "[expect]",
            '[[fixture.arms]]\npart_port = 1\nfile = "fixture/b.s2p"\nanalyzer_side = 1\n[expect]',
            "job.toml, line 41, fixture.arms[1].part_port: two arms for part port 1: fixture/arm_1.s2p and "
            "fixture/b.s2p. Keep one of them.",
        ),
        (
            "[expect]",
            '[fixture.coupled]\nfile = "f.s6p"\nanalyzer_side_ports = [1, 2, 3]\npart_side_ports = [4, 5, '
            "6]\n[expect]",
            "job.toml, line 40, fixture.coupled: both fixture.arms and fixture.coupled are given. "
            "A fixture is either one arm per port or one coupled network: keep one of them.",
        ),
        (
            'file = "raw/part_31.s2p"\nanalyzer_ports = [1, 2]',
            'file = "raw/part_31.s2p"',
            "job.toml, line 27, rounds[2].analyzer_ports: this key is missing. Add it, for example [1, 2].",
        ),
        (
            'drive = "every-port"',
            'drive = "every-port"\nswitch_terms = { 3 = "raw/s3.s1p" }',
            "job.toml, line 8, analyzer.switch_terms.3: switch terms for port 3, but the analyzer has 2 "
            "ports. "
            "Correct the port or analyzer.ports.",
        ),
        (
            "analyzer_side = 1",
            "analyzer_side = 3",
            "job.toml, line 38, fixture.arms[0].analyzer_side: 3 came; needed 1 or 2",
        ),
    ],
)
def test_what_cannot_be_is_refused_in_one_whole_sentence(old: str, new: str, message: str) -> None:
    assert old in GOOD
    refuse(GOOD.replace(old, new), message)


NONE = """\
[job]
part_ports = 2
[analyzer]
ports = 2
[calibration]
method = "none"
[[rounds]]
file = "part.s2p"
part_ports = [1, 2]
[fixture.coupled]
file = "board.s4p"
analyzer_side_ports = [1, 2]
part_side_ports = [3, 4]
[terminations]
1 = "t.s1p"
[expect]
tolerance = { gain = 0.005, match = 0.1 }
"""


def test_a_tolerance_per_property_and_a_coupled_fixture_are_taken() -> None:
    spec = validate(NONE)
    assert dict(spec.expect.tolerance) == tolerance_of(spec.expect) == {"gain": 0.005, "match": 0.1}
    assert spec.fixture.coupled.part_side_ports == (3, 4)
    assert repr(spec.terminations) == "FrozenMap({1: 't.s1p'})"


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            "part_side_ports = [3, 4]",
            "part_side_ports = [3]",
            "job.toml, line 13, fixture.coupled.part_side_ports: [3] came for a part with 2 ports. "
            "Name one port of the file per part port, in the order of the part ports.",
        ),
        (
            "part_side_ports = [3, 4]",
            "part_side_ports = [3, 2]",
            "job.toml, line 13, fixture.coupled.part_side_ports: analyzer side [1, 2] and part side [3, 2] "
            "do not name "
            "each of the ports 1 to 4 once. Correct the port map.",
        ),
        (
            "part_ports = [1, 2]",
            "part_ports = [2]",
            "job.toml, line 9, rounds[0].part_ports: [2] reads one port alone of a part with 2 ports. "
            "Read at least two ports at a time.",
        ),
        (
            "part_ports = [1, 2]",
            "part_ports = []",
            "job.toml, line 9, rounds[0].part_ports: it is empty; needed at least one entry",
        ),
        (
            "part_ports = [1, 2]",
            "part_ports = [0, 2]",
            "job.toml, line 9, rounds[0].part_ports[0]: 0 came; input should be greater than or equal to 1",
        ),
        (
            '1 = "t.s1p"',
            "1 = 0.5",
            "job.toml, line 14, terminations: has 0.5 for port 1; needed the name of a file",
        ),
        (
            "[analyzer]\nports = 2",
            "[analyzer]\nswitch_terms = 3",
            'job.toml, line 4, analyzer.switch_terms: must be a table such as { 3 = "raw/file_3.s1p" }',
        ),
        (
            'method = "none"',
            'method = "solt"\nkit = "ideal"',
            "job.toml, line 5, calibration: method 'solt' needs readings of standards and there are none. "
            "Add one [[calibration.readings]] table per standard.",
        ),
    ],
)
def test_what_else_cannot_be(old: str, new: str, message: str) -> None:
    assert old in NONE
    refuse(NONE.replace(old, new), message)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            'method = "solt"',
            'method = "trl"\nisolation = true',
            "job.toml, line 11, calibration.isolation: method 'trl' takes no leakage out. "
            "Set isolation = false, or use solt.",
        ),
        (
            'standard = "open"',
            'standard = "isolation"',
            "job.toml, line 13, calibration.readings[0].standard: an isolation reading came and "
            "calibration.isolation is "
            "false. Set isolation = true, or remove the reading.",
        ),
    ],
)
def test_what_would_not_be_used_is_refused(old: str, new: str, message: str) -> None:
    refuse(GOOD.replace(old, new), message)
    refuse(
        NONE.replace('method = "none"', 'method = "none"\nkit = "ideal"'),
        "job.toml, line 7, calibration.kit: a kit came with method 'none', which uses none. "
        "Remove it, or name the method that it belongs to.",
    )


def test_one_analyzer_port_cannot_read_more() -> None:
    text = GOOD.replace("ports = 2\n", "ports = 1\n", 1)
    refuse(
        text,
        "job.toml, line 6, analyzer.ports: one analyzer port cannot read a part with 3 ports. "
        "Correct analyzer.ports or job.part_ports.",
    )


def test_the_two_directions_of_a_round_have_one_termination() -> None:
    back = ""
    for i, two in enumerate(([2, 1], [3, 2], [1, 3])):
        back += f'[[rounds]]\nfile = "back_{i}.s2p"\nanalyzer_ports = [1, 2]\npart_ports = {two}\n'
    text = GOOD.replace('"every-port"', '"first-port-only"').replace(
        "[terminations]", f"{back}\n[terminations]"
    )
    validate(text)
    refuse(
        text.replace("part_ports = [1, 2]\n", 'part_ports = [1, 2]\nterminations = { 3 = "raw/x.s1p" }\n'),
        "job.toml, line 21, rounds[0].terminations: rounds 1-2 and 2-1 are the two directions of one round "
        "and name "
        "different terminations. Give both the same.",
    )


def test_a_pair_never_read_is_named() -> None:
    text = GOOD.replace("part_ports = 3", "part_ports = 4").replace("[3, 1]", "[3, 4]")
    refuse(
        text,
        "job.toml, line 17, rounds: no round reads part ports 1-3, 1-4 and 2-4. Add a round with "
        "part_ports = [1, 3].",
    )


def test_where_only_the_first_port_drives_the_turned_sweep_is_needed() -> None:
    refuse(
        GOOD.replace('"every-port"', '"first-port-only"'),
        "job.toml, line 20, rounds[0].part_ports: only the first port drives, and the sweep of the turned "
        "part to "
        "round 1-2 is missing. Add a round with part_ports = [2, 1].",
    )
    refuse(
        GOOD.replace('"every-port"', '"first-port-only"').replace("ports = 2", "ports = 4"),
        'job.toml, line 7, analyzer.drive: "first-port-only" came with an analyzer of 4 ports; it is for '
        "two. "
        "Set analyzer.ports = 2.",
    )
    refuse(
        GOOD.replace('"every-port"', '"first-port-only"').replace('"solt"', '"trl"'),
        "job.toml, line 7, analyzer.drive: method 'trl' cannot be used with drive 'first-port-only'. "
        "It needs every-port.",
    )


@pytest.mark.parametrize(
    ("text", "message"),
    [
        (
            "[job]\npart_ports = \n",
            "job.toml, line 2: this is not TOML (Invalid value). Correct the line; text values stand in "
            "double "
            "quotes, lists in square brackets.",
        ),
        (
            "[calibration]\nmethod = 'none'\n",
            "job.toml, job: this key is missing. Add a [job] table with at least part_ports.",
        ),
        (
            "[job]\npart_ports = 2\n[calibration]\nmethod = 'none'\n",
            "job.toml, rounds: this key is missing. Add one [[rounds]] table per sweep of the part.",
        ),
        ("job = 3\n", "job.toml, line 1, job: 3 came; needed a table"),
    ],
)
def test_a_text_that_is_no_job_is_refused(text: str, message: str) -> None:
    refuse(text, message)


def test_lines_are_found_through_comments_strings_and_nested_tables() -> None:
    text = 'a = """\n[not.a.table]\nb = 1\n"""\n[t]  # note\n"q" = 1\n'
    text += "[[l]]\n[l.m]\nk = 2\n[[l]]\nk = { x = 1 }\n"
    assert line_of(text, ("a",)) == 1
    assert line_of(text, ("t", "q")) == 6
    assert line_of(text, ("l", 0, "m", "k")) == 9
    assert line_of(text, ("l", 1, "k", "x")) == 11
    assert line_of(text, ("l",)) == 7
    assert line_of(text, ("absent",)) is None


def test_key_paths_are_written_as_they_are_read() -> None:
    path = ("fixture", "arms", 2, "file")
    assert parse_path(path_words(path)) == path
    for words in ("", "a..b", "[0].a", "a[x]"):
        with pytest.raises(JobError, match=re.escape(f"{words!r} is not a key of a job")):
            parse_path(words)
