"""The demonstration folder: clean it is believed, and each mistake is seen or said to be unseeable."""

import json

import numpy as np
import pytest

import deembed
from deembed.errors import FileError, JobError
from deembed.simulate.demo import MISTAKES, write_demo

POINTS = 401


@pytest.fixture(scope="module")
def outcomes(tmp_path_factory):
    """Outcome of the clean demonstration (None) and of each mistake."""
    folder = tmp_path_factory.mktemp("demo")
    found = {}
    for mistake in (None, *MISTAKES):
        job = write_demo(folder / str(mistake), mistake=mistake, points=POINTS)
        found[mistake] = (job, deembed.load_job(job).run())
    return found


def test_the_clean_one_is_believed_without_a_warning(outcomes):
    _, outcome = outcomes[None]
    assert outcome.verdict.startswith("Physical as far as these readings can show: passive and reciprocal")
    assert [f.text for f in outcome.findings if f.severity != "note"] == []


def test_the_clean_one_recovers_the_truth_within_its_imperfections(outcomes):
    job, outcome = outcomes[None]
    truth = deembed.read_touchstone(job.parent / "truth/part.s3p")
    error = np.abs(outcome.part.values - truth.values)
    assert error.max() < 0.006  # loads off by 0.12 ohm, connectors near -60 dB, noise, drift
    assert np.sqrt(np.mean(error**2)) < 0.002


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_other_analyzers_say_the_same(tmp_path, seed):
    said = {}
    for mistake in (None, "standards-exchanged", "thru-length"):
        job = write_demo(tmp_path / str(mistake), mistake=mistake, points=801, seed=seed)
        outcome = deembed.load_job(job).run()
        said[mistake] = outcome.verdict, {f.where for f in outcome.findings if f.severity != "note"}
    assert said[None][1] == set()
    assert "open 2, short 2" in said["standards-exchanged"][0]
    assert "thru 1-2" in said["thru-length"][0]
    assert "open 2, short 2" not in said["thru-length"][1]


def test_terminations_are_as_good_as_good_ones_are(tmp_path):
    folder = write_demo(tmp_path / "x", points=401).parent
    for port in (1, 2, 3):
        s = deembed.read_touchstone(folder / f"raw/termination_{port}.s1p").sel(frequency=slice(4e9, None))
        assert -33 < 20 * np.log10(np.abs(s.values)).min() < 20 * np.log10(np.abs(s.values)).max() < -24


def test_exchanged_standards_are_named_with_their_port(outcomes):
    _, outcome = outcomes["standards-exchanged"]
    assert outcome.verdict.startswith("Not believable as a passive part")
    assert "open 2, short 2" in outcome.verdict
    signs = [f for f in outcome.findings if f.kind == "tracking-sign"]
    assert [f.where for f in signs] == ["open 2, short 2"]


def test_a_long_thru_is_named_with_its_picoseconds(outcomes):
    _, outcome = outcomes["thru-length"]
    assert "thru 1-2" in outcome.verdict
    (finding,) = (f for f in outcome.findings if f.kind == "redundancy")
    assert finding.where == "thru 1-2"
    assert "it is 12 ps longer than said" in finding.text


def test_a_reversed_arm_is_seen_or_said_to_be_unseeable(outcomes):
    _, clean = outcomes[None]
    job, outcome = outcomes["arm-reversed"]
    named = [f for f in outcome.findings if "arm 2" in f.where.split(", ") and f.severity != "note"]
    spots = [b for b in outcome.blind_spots if b.cause == "arm-reversed" and b.where == "arm 2"]
    assert named or (spots and "arm 1, arm 2 or arm 3 being the wrong way round" in outcome.verdict)
    truth = deembed.read_touchstone(job.parent / "truth/part.s3p")
    if spots:  # the size it gives for the unseen error is the error there really is
        error = 20 * np.log10(np.abs(outcome.part.values - truth.values).max())
        assert spots[0].unseen_error_db == pytest.approx(error, abs=1.0)
    assert [f.text for f in outcome.findings] != [f.text for f in clean.findings]


def test_the_job_file_does_not_give_a_mistake_away(outcomes):
    texts = {job.read_text() for job, _ in outcomes.values()}
    notes = {(job.parent / "NOTES.txt").read_text() for job, _ in outcomes.values()}
    assert len(texts) == 1 and len(notes) == 1
    assert not any(name in next(iter(texts)) + next(iter(notes)) for name in MISTAKES)


def test_one_seed_gives_the_same_bytes(tmp_path):
    jobs = [write_demo(tmp_path / name, points=21) for name in "ab"]
    files = [sorted(p for p in job.parent.rglob("*") if p.is_file()) for job in jobs]
    assert [p.read_bytes() for p in files[0]] == [p.read_bytes() for p in files[1]]
    other = write_demo(tmp_path / "c", points=21, seed=5)
    assert (other.parent / "raw/open_1.s1p").read_bytes() != files[0][0].read_bytes()


def test_it_writes_into_no_folder_that_holds_something(tmp_path):
    (tmp_path / "mine.txt").write_text("mine")
    with pytest.raises(FileError, match=r"is there already and not an empty folder\. Name a new folder"):
        write_demo(tmp_path)
    assert [p.name for p in tmp_path.iterdir()] == ["mine.txt"]


def test_a_place_where_no_folder_can_be_is_an_error(tmp_path):
    (tmp_path / "file").write_text("")
    with pytest.raises(
        FileError, match=r"demo: cannot be made \(Not a directory\)\. Name a folder that you may"
    ):
        write_demo(tmp_path / "file" / "demo")


def test_an_unknown_mistake_names_the_nearest(tmp_path):
    with pytest.raises(JobError, match=r"no mistake is called 'arm-revers'\. Did you mean 'arm-reversed'\?"):
        write_demo(tmp_path / "x", mistake="arm-revers")
    assert not (tmp_path / "x").exists()


def test_too_few_points(tmp_path):
    with pytest.raises(JobError, match=r"demo: 3 points\. Ask for 11 or more"):
        write_demo(tmp_path / "x", points=3)


def test_findings_on_disk_say_the_same(outcomes, tmp_path):
    _, outcome = outcomes["thru-length"]
    outcome.write(tmp_path / "out")
    written = json.loads((tmp_path / "out/findings.json").read_text())
    assert [f["text"] for f in written["findings"]] == [f.text for f in outcome.findings]
