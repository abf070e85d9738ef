"""outcome.nc holds everything, bit for bit, and runs again to the same numbers."""

from __future__ import annotations

import hashlib
import json
import os
import re
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from deembed.errors import FileError
from deembed.job import Outcome, load_job, open_outcome
from deembed.job.archive import write_archive

Bench = Callable[..., Path]


def bits(array: xr.DataArray) -> bytes:
    return np.ascontiguousarray(array.values).tobytes()


@pytest.fixture(params=["none", "solt", "trl"])
def outcome(request: pytest.FixtureRequest, bench: Bench) -> Outcome:
    terminations = {1: 0.1, 2: 0.2j, 3: -0.1}
    return load_job(bench(method=request.param, terminations=terminations, points=7)).run()


def test_everything_comes_back_bit_for_bit(outcome: Outcome, tmp_path: Path) -> None:
    path = tmp_path / "outcome.nc"
    write_archive(outcome, path)
    back = open_outcome(path)
    for name in ("part", "assembled", "disagreement", "metrics", "shell", "terms"):
        ours, theirs = getattr(outcome, name), getattr(back, name)
        assert (ours is None and theirs is None) or theirs.identical(ours), name
    for name in ("part", "assembled", "disagreement"):
        assert bits(getattr(back, name)) == bits(getattr(outcome, name))
    assert len(back.rounds) == 3
    for ours, theirs in zip(outcome.rounds, back.rounds, strict=True):
        assert theirs.identical(ours) and theirs.name == ours.name and bits(theirs) == bits(ours)
    assert back.raw.keys() == outcome.raw.keys()
    for name, ours in outcome.raw.items():
        assert back.raw[name].identical(ours) and bits(back.raw[name]) == bits(ours)
    assert (back.findings, back.blind_spots, back.verdict) == (
        outcome.findings,
        outcome.blind_spots,
        outcome.verdict,
    )
    assert back.job.text == outcome.job.text and back.job.spec == outcome.job.spec


def test_running_it_again_gives_identical_numbers(outcome: Outcome, tmp_path: Path) -> None:
    write_archive(outcome, tmp_path / "outcome.nc")
    again = load_job(tmp_path / "outcome.nc").run()
    assert again.part.identical(outcome.part) and bits(again.part) == bits(outcome.part)
    assert again.metrics.identical(outcome.metrics)
    assert again.findings == outcome.findings and again.verdict == outcome.verdict
    write_archive(again, tmp_path / "second.nc")
    hashes = [
        {e["name"]: e["sha256"] for e in json.loads(xr.open_dataset(tmp_path / name).attrs["inputs"])}
        for name in ("outcome.nc", "second.nc")
    ]
    assert hashes[0] == hashes[1]


def test_the_hash_is_that_of_the_file(bench: Bench, tmp_path: Path) -> None:
    job = bench(method="solt", points=5)
    write_archive(load_job(job).run(), tmp_path / "outcome.nc")
    with xr.open_dataset(tmp_path / "outcome.nc") as root:
        entries = json.loads(root.attrs["inputs"])
        assert root.attrs["job_toml"] == job.read_text()
    assert {"kit.toml", "raw/thru_12.s2p", "raw/part_31.s2p", "fixture/arm_2.s2p"} <= {
        e["name"] for e in entries
    }
    for entry in entries:
        assert entry["sha256"] == hashlib.sha256((job.parent / entry["name"]).read_bytes()).hexdigest()
        with xr.open_dataset(tmp_path / "outcome.nc", group=entry["group"]) as raw:
            assert raw.attrs["name"] == entry["name"] and raw.attrs["sha256"] == entry["sha256"]
            assert raw.attrs["role"] == ", ".join(entry["keys"])


def test_plain_xarray_reads_it_in_a_fresh_process(bench: Bench, tmp_path: Path) -> None:
    outcome = load_job(bench(method="solt", points=5)).run()
    path = tmp_path / "outcome.nc"
    write_archive(outcome, path)
    script = """
import sys, warnings
warnings.simplefilter("error")
import xarray as xr
root = xr.open_dataset(sys.argv[1])
sys.stdout.write(root.part.values.tobytes().hex() + "\\n")
assert root.part.dims == ("frequency", "port_out", "port_in") and "largest_singular_value" in root
for group in ("assembled", "shell", "terms", "disagreement", "rounds/1"):
    assert xr.open_dataset(sys.argv[1], group=group).frequency.size == 5, group
assert xr.open_dataset(sys.argv[1], group="terms").analyzer_port_out.values.tolist() == [1, 2]
with xr.open_datatree(sys.argv[1], engine="h5netcdf") as tree:
    assert tree["raw/1"]["s"].dtype == complex
assert "deembed" not in sys.modules
"""
    done = subprocess.run(
        [sys.executable, "-c", script, str(path)],
        capture_output=True,
        text=True,
        check=False,
        env={**os.environ},
    )
    assert done.returncode == 0, done.stderr
    assert done.stdout.strip() == bits(outcome.part).hex()


def test_a_job_from_an_archive_needs_no_folder_and_says_what_it_lacks(bench: Bench, tmp_path: Path) -> None:
    outcome = load_job(bench(method="none", points=5)).run()
    write_archive(outcome, tmp_path / "outcome.nc")
    for file in (tmp_path / "bench").rglob("*.s2p"):
        file.unlink()
    job = load_job(tmp_path / "outcome.nc")
    assert job.run().part.identical(outcome.part)
    message = (
        "fixture.arms[0].file: 'fixture/arm_9.s2p' is not in the archive outcome.nc. "
        "Nearest: fixture/arm_3.s2p."
    )
    with pytest.raises(FileError, match=re.escape(message)):
        job.changed({"fixture.arms[0].file": "fixture/arm_9.s2p"}).run()


def test_an_edited_reading_is_kept_as_edited(bench: Bench, tmp_path: Path) -> None:
    job = load_job(bench(method="none", points=5))
    name = "raw/part_12.s2p"
    edited = job.with_reading(name, job.run().raw[name] * 0.5).run()
    write_archive(edited, tmp_path / "outcome.nc")
    again = load_job(tmp_path / "outcome.nc").run()
    assert again.part.identical(edited.part) and again.job.inputs.get(name, key="").edited
    with pytest.raises(
        FileError, match=r"the job loads no 'raw/x\.s2p'\. It loads raw/part_12\.s2p, raw/part_23"
    ):
        job.with_reading("raw/x.s2p", edited.part)


def test_what_is_no_archive_is_refused(tmp_path: Path) -> None:
    wrong = tmp_path / "outcome.nc"
    with pytest.raises(FileError, match=re.escape(f"{wrong}: no such file. Give the path of an outcome.nc.")):
        open_outcome(wrong)
    wrong.write_text("not netCDF")
    with pytest.raises(
        FileError, match=re.escape(f"{wrong}: this is not a netCDF file that can be opened (")
    ):
        load_job(wrong)
    xr.Dataset({"a": 1}).to_netcdf(wrong, engine="h5netcdf")
    message = f"{wrong}: this netCDF file holds no job. Give an outcome.nc written by a run."
    with pytest.raises(FileError, match=re.escape(message)):
        load_job(wrong)
    xr.Dataset({"a": 1}, attrs={"job_toml": "", "format_version": 9}).to_netcdf(wrong, engine="h5netcdf")
    message = f"{wrong}: format version 9 is newer than this program reads (1). Update deembed."
    with pytest.raises(FileError, match=re.escape(message)):
        load_job(wrong)


def test_attributes_that_are_numpy_numbers_are_kept_and_others_refused(bench: Bench, tmp_path: Path) -> None:
    from dataclasses import replace

    outcome = load_job(bench(method="none", arms=False, points=3)).run()
    marked = replace(
        outcome,
        part=outcome.part.assign_attrs(level=np.float64(0.5), ports=np.array([1, 2])),
        disagreement=None,
    )
    write_archive(marked, tmp_path / "outcome.nc")
    back = open_outcome(tmp_path / "outcome.nc")
    assert back.part.attrs == {"level": 0.5, "ports": [1, 2]} and back.disagreement is None
    with pytest.raises(TypeError, match="cannot be kept in an archive"):
        write_archive(replace(outcome, part=outcome.part.assign_attrs(x=object())), tmp_path / "other.nc")


def test_the_words_of_the_job_are_kept_in_every_output(bench: Bench, tmp_path: Path) -> None:
    said = {
        "operator": "R. Weir",
        "instrument": "bench two",
        "kit_due": "2027-03-01",
        "temperature_c": "23.1",
    }
    job = load_job(bench(method="none", arms=False, points=3)).changed(job=said)
    job.run().write(tmp_path / "out")
    comments = (tmp_path / "out/part.s3p").read_text()
    page = (tmp_path / "out/report.html").read_text()
    with xr.open_dataset(tmp_path / "out/outcome.nc") as root:
        text = root.attrs["job_toml"]
    for word in said.values():
        assert word in comments and word in page and word in text
