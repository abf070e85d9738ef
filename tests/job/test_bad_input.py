"""Every bad input: exit code 2, one message that says what, where and what to do, and nothing written."""

from __future__ import annotations

import re
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from deembed.job.command import main
from deembed.labels import sparams

Refuse = Callable[..., str]


@pytest.fixture
def refuse(tmp_path: Path, capsys: pytest.CaptureFixture) -> Refuse:
    """Run a job that cannot be run; returns the one line on stderr."""

    def run(job: Path) -> str:
        out = tmp_path / "out"
        before = sorted(str(p) for p in tmp_path.rglob("*"))
        assert main(["run", str(job), "--out", str(out)]) == 2
        said = capsys.readouterr()
        assert said.out == "" and said.err.count("\n") == 1
        assert sorted(str(p) for p in tmp_path.rglob("*")) == before
        return said.err.removeprefix("deembed: ").rstrip("\n")

    return run


def edit(path: Path, old: str, new: str) -> Path:
    text = path.read_text()
    assert old in text
    path.write_text(text.replace(old, new, 1))
    return path


def test_a_missing_file(bench: Callable, refuse: Refuse) -> None:
    job = edit(bench(method="solt"), "raw/open_2.s1p", "raw/opem_2.s1p")
    assert refuse(job) == (
        "job.toml, line 27, calibration.readings[3].file: 'raw/opem_2.s1p' does not exist. Paths are "
        "relative to the job "
        "file; correct "
        "the name or put the file there. A file 'open_2.s1p' lies there."
    )
    edit(job, "raw/opem_2.s1p", "nowhere/open_2.s1p")
    assert refuse(job) == (
        "job.toml, line 27, calibration.readings[3].file: 'nowhere/open_2.s1p' does not exist. Its folder "
        "does not exist; "
        "paths are "
        "relative to the job file."
    )
    edit(job, "nowhere/open_2.s1p", "raw")
    assert refuse(job).startswith("job.toml, line 27, calibration.readings[3].file: 'raw' is a folder. ")


def test_an_unknown_key_names_the_nearest(bench: Callable, refuse: Refuse) -> None:
    job = edit(bench(method="none"), "passive = true", "pasive = true")
    line = job.read_text().splitlines().index("pasive = true") + 1
    assert refuse(job) == (
        f"job.toml, line {line}, expect.pasive: unknown key 'pasive'. Did you mean passive? Known here: "
        f"passive, "
        "reciprocal, lossless, tolerance"
    )


def test_two_rounds_for_one_pair_a_port_never_read_an_arm_too_many(bench: Callable, refuse: Refuse) -> None:
    """Checked key by key in test_schema; here for exit code and nothing written."""
    job = bench(method="none")
    good = job.read_text()
    edit(job, "part_ports = [3, 1]", "part_ports = [1, 2]")
    assert (
        "two rounds for the same part ports 1-2: raw/part_12.s2p (rounds[0]) and raw/part_31.s2p"
        in refuse(job)
    )
    job.write_text(good)
    edit(job, "part_ports = 3", "part_ports = 4")
    assert "part port 4 is never read; the rounds are 1-2, 2-3 and 3-1" in refuse(job)
    job.write_text(good)
    edit(job, "part_port = 3", "part_port = 7")
    assert "an arm for part port 7, but the part has 3 ports" in refuse(job)


@pytest.mark.parametrize(
    ("content", "said"),
    [
        ("# Hz S RI R 50\n1e9 1 0 0 0 0 0\n", ["raw/part_23.s2p", "line 2"]),
        ("# Hz S RI R 50\n1e9 nan 0 0 0 0 0 0 0\n", ["raw/part_23.s2p", "1"]),
        ("# Hz S RI R 50\n2e9 0 0 0 0 0 0 0 0\n1e9 0 0 0 0 0 0 0 0\n", ["raw/part_23.s2p", "2", "1 GHz|1e"]),
        ("# Hz S RI R 50\n1e9 0 0 0 0 0 0 0 0\n1e9 0 0 0 0 0 0 0 0\n", ["raw/part_23.s2p", "1 GHz|1e"]),
        ("# S RI R 50\n1e9 0 0 0 0 0 0 0 0\n", ["raw/part_23.s2p", "unit"]),
        ("# Hz S RI R 50\n1e9 0.5 0\n2e9 0.5 0\n", ["raw/part_23.s2p", "2|port"]),
        ("", ["raw/part_23.s2p"]),
    ],
    ids=["columns", "nan", "falling", "repeated", "unit", "ports", "empty"],
)
def test_a_touchstone_file_that_cannot_be_used(
    bench: Callable, refuse: Refuse, content: str, said: list[str]
) -> None:
    job = bench(method="none")
    (job.parent / "raw/part_23.s2p").write_text(content)
    message = refuse(job)
    assert "(rounds[1].file)" in message
    for words in said:
        assert re.search(words, message), message


def test_grids_that_differ_are_both_named(bench: Callable, refuse: Refuse) -> None:
    job = bench(method="solt", calibration_grid=np.linspace(1e9, 2e9, 11))
    assert refuse(job) == (
        "frequency grids differ: raw/part_12.s2p (rounds[0].file) has 21 points, 1 GHz to 3 GHz; "
        "raw/open_1.s1p "
        "(calibration.readings[0].file) has 11 points, 1 GHz to 2 GHz. Read both on one grid, or allow "
        "interpolation with job.interpolate = true."
    )
    edit(job, "part_ports = 3\n", "part_ports = 3\ninterpolate = true\n")
    assert refuse(job) == (
        "nothing is extrapolated: the error terms: only 11 points, 1 GHz to 2 GHz came; the part was read "
        "over "
        "21 points, 1 GHz to 3 GHz. Read it over the whole band of the part, or read the part over less."
    )


def test_raw_readings_are_never_interpolated(bench: Callable, refuse: Refuse, make: dict) -> None:
    job = edit(bench(method="none"), "part_ports = 3\n", "part_ports = 3\ninterpolate = true\n")
    other = make["grid"]() + np.eye(21)[4] * 1e3
    make["save"](job.parent, "raw/part_23.s2p", sparams(np.zeros((21, 2, 2)), other))
    assert refuse(job) == (
        "frequency grids differ: raw/part_12.s2p (rounds[0].file) has 21 points, 1 GHz to 3 GHz; "
        "raw/part_23.s2p "
        "(rounds[1].file) has 21 points, 1 GHz to 3 GHz; they first differ at point 5: 1400000000 Hz and "
        "1400001000 Hz. Raw readings are never interpolated: read all rounds on one grid."
    )


def test_a_standard_that_is_not_in_the_kit(bench: Callable, refuse: Refuse) -> None:
    job = edit(bench(method="solt"), 'standard = "short"', 'standard = "shirt"')
    line = job.read_text().splitlines().index('standard = "shirt"') + 1
    assert refuse(job) == (
        f"job.toml, line {line}, calibration.readings[1].standard: standard 'shirt' is not in the kit "
        f"'bench'. "
        "Did you mean short? The kit has open, short, load, thru, line, reflect."
    )


def test_a_kit_that_is_not_there_or_not_a_kit(bench: Callable, refuse: Refuse) -> None:
    job = edit(bench(method="solt"), 'kit = "kit.toml"', 'kit = "idael"')
    message = refuse(job)
    assert message.startswith(
        "job.toml, line 11, calibration.kit: no kit is called 'idael'. Did you mean ideal? Shipped: "
    )
    assert message.endswith("or give the path of a kit file ending in .toml.")
    edit(job, 'kit = "idael"', 'kit = "kit.toml"')
    (job.parent / "kit.toml").write_text("[kit]\nname = 3\n[standards.open\n")
    assert "kit.toml" in refuse(job)


def drop(job: Path, standard: str, ports: str) -> None:
    block = re.compile(
        rf'\[\[calibration\.readings\]\]\nstandard = "{standard}"\nports = \[{ports}\]\nfile = "[^"]*"\n'
    )
    text, count = block.subn("", job.read_text())
    assert count == 1
    job.write_text(text)


@pytest.mark.parametrize(
    ("method", "standard", "ports", "said"),
    [
        ("solt", "thru", "1, 2", ["thru", "1-2|1 and 2|ports 1"]),
        ("solt", "short", "2", ["port 2", "short|standard|three"]),
        ("trl", "line", "1, 2", ["line"]),
        ("trl", "reflect", "1, 2", ["reflect"]),
    ],
)
def test_a_missing_standard_is_named_with_its_port(
    bench: Callable, refuse: Refuse, method: str, standard: str, ports: str, said: list[str]
) -> None:
    job = bench(method=method)
    drop(job, standard, ports)
    message = refuse(job)
    for words in said:
        assert re.search(words, message), message


def test_files_with_too_few_or_too_many_ports(bench: Callable, refuse: Refuse, make: dict) -> None:
    job = bench(method="solt", terminations={3: 0.1})
    good = job.read_text()
    edit(job, "raw/thru_12.s2p", "raw/open_1.s1p")
    assert refuse(job) == (
        "job.toml, line 39, calibration.readings[6].file: 'raw/open_1.s1p' has 1 port; needed analyzer "
        "ports 1 and 2. "
        "Give a file with 2 ports, or correct the port list."
    )
    job.write_text(good)
    edit(job, "raw/termination_3.s1p", "raw/part_12.s2p")
    assert refuse(job) == (
        "job.toml, line 57, terminations.3: 'raw/part_12.s2p' has 2 ports; needed a reflection, so one "
        "port. Give an .s1p file."
    )
    job.write_text(good)
    edit(job, "fixture/arm_2.s2p", "raw/open_1.s1p")
    assert re.search(r"arm 2.*port", refuse(job))


def test_nothing_to_compute_anywhere(bench: Callable, refuse: Refuse, make: dict) -> None:
    """Open and short read alike: singular at every frequency."""
    job = edit(bench(method="solt"), "raw/short_1.s1p", "raw/open_1.s1p")
    message = refuse(job)
    assert re.search("21 frequencies|every frequency|all 21", message), message


def test_a_solve_without_solution_at_some_frequencies_names_them(
    bench: Callable, refuse: Refuse, make: dict
) -> None:
    job = bench(method="solt")
    f = make["grid"]()
    short, open_ = (make["read"](make["standard"](n, f), on=(1,)) for n in ("short", "open"))
    make["save"](job.parent, "raw/short_1.s1p", short.where(short.frequency != f[7], open_))
    message = refuse(job)
    assert "1 frequency (1.7 GHz)" in message and "port 1" in message, message


def test_an_arm_that_passes_nothing_at_some_frequency_leaves_a_gap_that_is_said(
    bench: Callable, make: dict, tmp_path: Path
) -> None:
    from deembed.job import load_job

    job = bench(method="none")
    f = make["grid"]()
    arm = make["arm"](f, 2)
    through = np.array([[True, False], [False, True]])
    blocked = arm.copy(data=np.where((f == f[7])[:, None, None] & ~through, 0.0, arm.values))
    make["save"](job.parent, "fixture/arm_2.s2p", blocked)
    outcome = load_job(job).run()
    bad = ~np.isfinite(outcome.part.values).all(axis=(1, 2))
    assert np.flatnonzero(bad).tolist() == [7]
    (gap,) = [x for x in outcome.findings if x.kind == "not-computed"]
    assert gap.text == (
        "The part could not be computed at 1 frequency (1.7 GHz): a step before it has no solution there; "
        "those values "
        "are left empty."
    )
    assert gap.severity == "warning" and gap.from_hz == gap.to_hz == f[7]
    outcome.write(tmp_path / "out")
    text = (tmp_path / "out/part.s3p").read_text()
    assert "1 frequency without a value is left out; see findings.json" in text and "nan" not in text.lower()
    make["save"](job.parent, "fixture/arm_2.s2p", arm.where(arm.port_out == arm.port_in, 0.0))
    with pytest.raises(ValueError, match="nothing could be computed at any of the 21 frequencies"):
        load_job(job).run()


def test_a_standard_outside_its_band_is_a_finding(bench: Callable) -> None:
    from deembed.job import load_job

    job = bench(method="solt")
    edit(job.parent / "kit.toml", 'kind = "open"', 'kind = "open"\nvalid_hz = [0.0, 2e9]')
    outcome = load_job(job).run()
    said = [x for x in outcome.findings if x.where.startswith("open")]
    assert {x.where for x in said} == {"open 1", "open 2"} and all(
        x.severity != "contradiction" for x in said
    )
