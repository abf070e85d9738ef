"""The command line: exit codes, the four outputs, all or none."""

from __future__ import annotations

import json
import os
import re
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from deembed.job import command, load_job, open_outcome
from deembed.job.command import main
from deembed.touchstone import read_touchstone

Bench = Callable[..., Path]
FILES = ["findings.json", "outcome.nc", "part.s3p", "report.html"]


@pytest.fixture
def plain_report(monkeypatch: pytest.MonkeyPatch) -> None:
    """Where the report is not what is tested, a short one: pictures take seconds."""
    import deembed.report

    monkeypatch.setattr(deembed.report, "report_html", lambda outcome: f"<p>{outcome.verdict}</p>")


def names(folder: Path) -> list[str]:
    return sorted(p.name for p in folder.iterdir())


def test_a_run_writes_four_files_and_says_the_verdict_first(
    bench: Bench, tmp_path: Path, capsys: pytest.CaptureFixture
) -> None:
    job = bench(method="solt", points=11)
    out = tmp_path / "deep" / "out"
    assert main(["run", str(job), "--out", str(out)]) == 0
    assert names(out) == FILES and names(out.parent) == ["out"]
    said = capsys.readouterr()
    outcome = open_outcome(out / "outcome.nc")
    assert said.out.splitlines()[0] == outcome.verdict and said.err == ""
    for finding in outcome.findings:
        assert finding.text in said.out
    content = json.loads((out / "findings.json").read_text())
    assert list(content) == ["version", "verdict", "findings", "suspects", "blind_spots", "figures"]
    assert content["version"] == 1 and content["suspects"] == []
    assert content["findings"] == [f.as_dict() for f in outcome.findings]
    assert set(content["findings"][0]) == {
        *("id", "kind", "where", "severity", "from_hz", "to_hz", "worst", "worst_hz", "significance", "text")
    }
    assert content["blind_spots"] == [b.as_dict() for b in outcome.blind_spots] != []
    assert set(content["blind_spots"][0]) == {"cause", "where", "unseen_error_db", "reading", "text"}
    assert outcome.verdict.split(":")[0] in (out / "report.html").read_text()
    part = read_touchstone(out / "part.s3p")
    assert np.abs(part.values - outcome.part.values).max() < 1e-12
    comments = (out / "part.s3p").read_text()
    assert "Bench splitter" in comments and "raw/part_12.s2p" in comments and str(tmp_path) not in comments


@pytest.mark.usefixtures("plain_report")
def test_a_contradiction_gives_exit_code_1_and_the_files(
    bench: Bench, tmp_path: Path, capsys: pytest.CaptureFixture
) -> None:
    job = bench(method="none", expect="\n[expect]\nlossless = true\n", points=11)
    assert main(["run", str(job), "--out", str(tmp_path / "out")]) == 1
    assert names(tmp_path / "out") == FILES
    severities = [f["severity"] for f in json.loads((tmp_path / "out/findings.json").read_text())["findings"]]
    assert severities[0] == "contradiction"
    assert "  contradiction: " in capsys.readouterr().out


def test_what_cannot_be_run_gives_exit_code_2_one_message_and_nothing_else(
    bench: Bench, tmp_path: Path, capsys: pytest.CaptureFixture
) -> None:
    job = bench(method="none", arms=False, points=5)
    (job.parent / "raw/part_23.s2p").unlink()
    assert main(["run", str(job), "--out", str(tmp_path / "out")]) == 2
    said = capsys.readouterr()
    assert said.out == "" and len(said.err.splitlines()) == 1
    assert said.err.startswith(
        "deembed: job.toml, line 18, rounds[1].file: 'raw/part_23.s2p' does not exist. Paths are relative"
    )
    assert names(tmp_path) == ["bench"]


def test_the_module_runs_in_a_process_of_its_own(bench: Bench, tmp_path: Path) -> None:
    job = bench(method="none", arms=False, points=5)
    words = [sys.executable, "-m", "deembed", "run", str(job), "--out", "out"]
    done = subprocess.run(
        words, cwd=tmp_path, capture_output=True, text=True, check=False, env={**os.environ}
    )
    assert done.returncode == 0, done.stderr
    assert names(tmp_path / "out") == FILES
    words[4] = "out/outcome.nc"
    words[6] = "again"
    done = subprocess.run(
        words, cwd=tmp_path, capture_output=True, text=True, check=False, env={**os.environ}
    )
    assert done.returncode == 0, done.stderr
    assert open_outcome(tmp_path / "again/outcome.nc").part.identical(
        open_outcome(tmp_path / "out/outcome.nc").part
    )


@pytest.mark.usefixtures("plain_report")
def test_old_outputs_are_replaced_and_other_files_left_alone(bench: Bench, tmp_path: Path) -> None:
    job = load_job(bench(method="none", arms=False, points=5))
    out = tmp_path / "out"
    job.run().write(out)
    (out / "notes.txt").write_text("mine")
    written = job.changed({"job.title": "Second"}).run().write(out)
    assert [p.name for p in written] == FILES
    assert names(out) == sorted([*FILES, "notes.txt"]) and names(tmp_path) == ["bench", "out"]
    assert open_outcome(out / "outcome.nc").job.spec.job.title == "Second"


@pytest.mark.usefixtures("plain_report")
def test_a_link_to_a_folder_is_followed(bench: Bench, tmp_path: Path) -> None:
    (tmp_path / "real").mkdir()
    (tmp_path / "link").symlink_to(tmp_path / "real")
    written = load_job(bench(method="none", arms=False, points=5)).run().write(tmp_path / "link")
    assert written[0] == tmp_path / "link" / "findings.json"
    assert names(tmp_path / "real") == FILES and names(tmp_path) == ["bench", "link", "real"]


@pytest.mark.parametrize("failing", FILES)
def test_when_a_file_cannot_be_moved_in_the_old_ones_are_all_there(
    bench: Bench, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, failing: str
) -> None:
    job = load_job(bench(method="none", arms=False, points=5))
    out = tmp_path / "out"
    job.run().write(out)
    before = {p.name: p.read_bytes() for p in out.iterdir()}
    real = os.replace

    def replace(source: Path, target: Path) -> None:
        if Path(target) == out / failing and "new" in Path(source).parts:
            raise OSError(28, "No space left on device")
        real(source, target)

    monkeypatch.setattr(os, "replace", replace)
    with pytest.raises(ValueError, match=re.escape(f"{out}: it cannot be written (No space left on device)")):
        job.changed({"job.title": "Second"}).run().write(out)
    assert {p.name: p.read_bytes() for p in out.iterdir()} == before
    assert names(tmp_path) == ["bench", "out"]


@pytest.mark.usefixtures("plain_report")
def test_when_a_file_cannot_be_made_nothing_is_written(
    bench: Bench, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture
) -> None:
    import deembed.job.archive

    def full(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(deembed.job.archive, "write_archive", full)
    job = bench(method="none", arms=False, points=5)
    assert main(["run", str(job), "--out", str(tmp_path / "out")]) == 2
    assert (
        capsys.readouterr().err
        == f"deembed: {tmp_path / 'out'}: it cannot be written (No space left on device)\n"
    )
    assert names(tmp_path) == ["bench"]


@pytest.mark.parametrize(
    ("words", "message"),
    [
        (
            ["{tmp}/no.toml"],
            "deembed: {tmp}/no.toml: no such job file. Give the path of a job.toml or an outcome.nc.\n",
        ),
        (["{tmp}"], "deembed: {tmp}: this is a folder. Give the job file in it, usually job.toml.\n"),
    ],
)
def test_a_job_that_is_not_there(
    tmp_path: Path, capsys: pytest.CaptureFixture, words: list, message: str
) -> None:
    words = [w.format(tmp=tmp_path) for w in words]
    assert main(["run", *words, "--out", str(tmp_path / "out")]) == 2
    assert capsys.readouterr().err == message.format(tmp=tmp_path)


@pytest.mark.usefixtures("plain_report")
def test_an_output_that_is_a_file(bench: Bench, tmp_path: Path, capsys: pytest.CaptureFixture) -> None:
    job = bench(method="none", arms=False, points=5)
    (tmp_path / "out").write_text("mine")
    assert main(["run", str(job), "--out", str(tmp_path / "out")]) == 2
    message = f"deembed: {tmp_path}/out: this is a file, not a folder. Name another folder for the output.\n"
    assert capsys.readouterr().err == message
    assert (tmp_path / "out").read_text() == "mine"


def test_help_explains_itself(capsys: pytest.CaptureFixture) -> None:
    for words, expected in (
        (["--help"], "run a job file"),
        (["run", "--help"], "Exit codes: 0 done; 1 done"),
    ):
        with pytest.raises(SystemExit, match=r"^0$"):
            main(words)
        assert expected in " ".join(capsys.readouterr().out.split())
    with pytest.raises(SystemExit, match=r"^2$"):
        main([])
    assert "usage: python -m deembed" in capsys.readouterr().err


@pytest.mark.usefixtures("plain_report")
def test_a_bar_on_a_terminal_once_the_work_is_long(
    bench: Bench, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture
) -> None:
    job = bench(method="none", arms=False, points=5)
    monkeypatch.setattr(command, "_PATIENCE", 0.0)
    main(["run", str(job), "--out", str(tmp_path / "out")])
    assert capsys.readouterr().err == ""  # not a terminal
    monkeypatch.setattr(sys.stderr, "isatty", lambda: True)
    main(["run", str(job), "--out", str(tmp_path / "out")])
    said = capsys.readouterr().err
    assert "stripping the fixture" in said and "100%" in said


def test_stopping_by_hand_writes_nothing(
    bench: Bench, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture
) -> None:
    from deembed.job import steps

    def stop(*_: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(steps, "in_reference", stop)
    job = bench(method="none", arms=False, points=5)
    assert main(["run", str(job), "--out", str(tmp_path / "out")]) == 2
    assert capsys.readouterr().err == "deembed: stopped; nothing was written\n"
    assert names(tmp_path) == ["bench"]


def test_demo_writes_a_job_that_runs(tmp_path: Path, capsys: pytest.CaptureFixture) -> None:
    assert main(["demo", str(tmp_path / "demo")]) == 0
    said = capsys.readouterr().out
    assert f"python -m deembed run {tmp_path / 'demo' / 'job.toml'} --out out/" in said
    assert load_job(tmp_path / "demo" / "job.toml").spec.job.part_ports == 3


def test_an_unknown_mistake_names_the_nearest(tmp_path: Path, capsys: pytest.CaptureFixture) -> None:
    assert main(["demo", str(tmp_path / "demo"), "--mistake", "arm-revresed"]) == 2
    said = capsys.readouterr()
    assert said.out == "" and "arm-revresed" in said.err and "arm-reversed" in said.err
    assert names(tmp_path) == []


@pytest.mark.usefixtures("plain_report")
def test_where_the_output_cannot_be_made(
    bench: Bench, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture
) -> None:
    job = bench(method="none", arms=False, points=5)
    (tmp_path / "file").write_text("mine")
    assert main(["run", str(job), "--out", str(tmp_path / "file" / "out")]) == 2
    assert "it cannot be written (File exists)" in capsys.readouterr().err

    def refuse(*_: object, **__: object) -> None:
        raise PermissionError(13, "Permission denied", "a file")

    monkeypatch.setattr("deembed.job.job.Job.run", refuse)
    assert main(["run", str(job), "--out", str(tmp_path / "out")]) == 2
    assert capsys.readouterr().err == "deembed: a file: Permission denied\n"


def test_a_job_file_that_is_not_text(tmp_path: Path, capsys: pytest.CaptureFixture) -> None:
    (tmp_path / "job.toml").write_bytes(b'[job]\ntitle = "\xff"\n')
    assert main(["run", str(tmp_path / "job.toml"), "--out", str(tmp_path / "out")]) == 2
    assert f"{tmp_path / 'job.toml'}: it cannot be read as text (" in capsys.readouterr().err
