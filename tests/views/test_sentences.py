"""Sentences lose no finding and say what was not seen."""

from deembed.findings import BlindSpot, Finding
from deembed.views import sentences
from deembed.views.job_facts import facts_of


def test_a_finding_becomes_severity_place_band_and_size(outcome):
    line = sentences.finding_lines(outcome.findings)[0]
    assert (line.severity, line.shape, line.place) == ("contradiction", "◆", "the part")
    assert line.band == "3.86 to 4.26 GHz, worst at 4.06 GHz"
    assert line.significance == "12 standard uncertainties"
    assert line.text == outcome.findings[0].text


def test_every_finding_has_its_line_in_order(outcome):
    assert [f.id for f in sentences.finding_lines(outcome.findings)] == [f.id for f in outcome.findings]


def test_a_finding_without_band_or_significance_says_so():
    line = sentences.finding_line(Finding("x", "kind", "arm 1", "note", "text"))
    assert (line.band, line.significance, line.place) == ("whole sweep", "not known", "arm 1")
    one = sentences.finding_line(Finding("x", "kind", "", "note", "text", 1e9, 1e9, 0.1, 1e9))
    assert one.band == "1 GHz"


def test_plain_text_leaves_nothing_out(outcome):
    spot = BlindSpot("arm reversed", "arm 2", 0.34, "read a short behind arm 2", "Arm 2 turned round.")
    said = sentences.plain_text(outcome.changed(blind_spots=(spot,))).splitlines()
    assert said[0] == outcome.verdict
    assert said[1] == "Findings: 1 contradiction, 2 warnings and 2 notes"
    assert said[2] == f"◆ contradiction, the part: {outcome.findings[0].text}"
    assert len(said) > 2 + len(outcome.findings)
    assert "Arm 2 turned round. To see it: read a short behind arm 2." in said


def test_findings_are_counted_in_words(outcome):
    assert sentences.tally(outcome.findings) == "1 contradiction, 2 warnings and 2 notes"
    assert sentences.tally([]) == "no findings"


def test_blind_spots_keep_size_and_reading(outcome):
    spots = (
        BlindSpot("arm reversed", "arm 2", 0.34, "read a short behind arm 2", "Arm 2 turned round."),
        BlindSpot("other", "", None, "read it again", "Something."),
    )
    assert sentences.blind_lines(outcome.changed(blind_spots=spots)) == (
        ("Arm 2 turned round.", "arm 2", "0.34 dB", "read a short behind arm 2"),
        ("Something.", "the part", "not known", "read it again"),
    )


def test_evidence_a_job_lacks_is_said(outcome, fake):
    said = " ".join(sentences.unwitnessed(outcome))
    assert "Not judged, because [expect] does not say: lossless." in said
    assert "taken at its word" in said
    bare = outcome.terms.drop_vars("redundancy").assign_attrs(redundancy_absent="one port alone drives")
    assert "one port alone drives" in " ".join(sentences.unwitnessed(outcome.changed(terms=bare)))
    job = fake.job()
    job.spec.rounds, job.spec.expect.lossless = job.spec.rounds[:1], False
    said = " ".join(sentences.unwitnessed(outcome.changed(job=job, terms=None, shell=None)))
    assert "came already corrected" in said
    assert "read in one round" in said
    assert "No fixture was taken off" in said
    assert "Not judged" not in said


def test_facts_keep_what_the_user_typed(outcome):
    rows = dict(sentences.facts_rows(outcome))
    assert rows["Part"] == "River-gauge splitter, board <B> (3 ports)"
    assert rows["Note"] == "<script>alert(1)</script>"
    assert rows["Operator"] == 'A. "Ampere"'
    assert rows["Temperature (°C)"] == "23"
    assert rows["Rounds (part ports)"] == "1-2, 2-3 and 3-1"
    assert rows["Expected"] == "passive: yes, reciprocal: yes"
    assert "Instrument" not in rows
    assert "arm 2: fixture/arm_2.s2p, its port 1 faces the analyzer" in rows["Fixture"]


def test_inputs_carry_their_hashes(outcome, fake):
    lines = sentences.input_lines(outcome)
    assert [i.name for i in lines] == [name for _, name in outcome.job.input_names()]
    assert all(len(i.sha256) == 64 for i in lines)


def test_inputs_say_what_they_were_used_for(outcome):
    used = [i.used_for for i in sentences.input_lines(outcome)]
    assert used[0] == "open on port 1"
    assert used[6] == "thru on ports 1 and 2"
    assert used[7:10] == ["round 1-2", "round 2-3", "round 3-1"]
    assert used[10:] == ["arm 1", "arm 2", "arm 3", "termination of part port 3", "kit", "calibration.kit x"]


def test_versions_name_what_computed():
    rows = dict(sentences.version_rows())
    assert {"Python", "deembed", "numpy", "scikit-rf"} <= set(rows)


def test_cautions_cover_the_bench():
    about = {c.about for c in sentences.CAUTIONS}
    assert {"What this is not", "RF power", "Static", "Connectors", "Lifting", "Local rules"} == about
    assert any("not a calibration certificate" in c.text for c in sentences.CAUTIONS)


def test_facts_of_a_job_without_ports_per_round_count_from_one(fake):
    job = fake.job()
    job.spec.rounds[0].analyzer_ports = None
    job.spec.calibration.kit = None
    facts = facts_of(job)
    assert facts.rounds[0].analyzer_ports == (1, 2)
    assert facts.kit == ""
    assert facts.rounds[0].terminations == {3: "raw/termination_3.s1p"}
