"""Inputs are read once, hashed, and called by the names the job file uses."""

from __future__ import annotations

import hashlib
from collections.abc import Callable
from pathlib import Path

import pytest

from deembed.findings import Finding
from deembed.job.inputs import Inputs, hash_of_array, is_shipped_kit
from deembed.job.job import _each_once


def test_a_file_is_read_once_and_hashed_by_its_bytes(tmp_path: Path) -> None:
    raw = "! \u00b5m, old file\n# Hz S RI R 50\n1e9 0.5 0\n".encode("latin-1")
    (tmp_path / "a.s1p").write_bytes(raw)
    inputs = Inputs(tmp_path)
    entry = inputs.get("a.s1p", key="rounds[0].file")
    assert entry.sha256 == hashlib.sha256(raw).hexdigest() and entry.text.startswith("! \u00b5m")
    (tmp_path / "a.s1p").write_text("changed")
    assert inputs.get("a.s1p", key="rounds[0].file") is entry
    first = inputs.sparams("a.s1p", key="rounds[0].file")
    assert inputs.sparams("a.s1p", key="rounds[0].file") is first and first.values[0, 0, 0] == 0.5


def test_an_edited_input_leaves_the_others_alone(tmp_path: Path, make: dict) -> None:
    f = make["grid"](3)
    make["save"](tmp_path, "a.s2p", make["arm"](f, 1))
    inputs = Inputs(tmp_path)
    before = inputs.sparams("a.s2p", key="")
    other = inputs.edited("a.s2p", before * 2)
    assert other.sparams("a.s2p", key="").identical(before * 2)
    assert inputs.sparams("a.s2p", key="") is before
    assert other.get("a.s2p", key="").sha256 == hash_of_array(before * 2) != hash_of_array(before)


@pytest.mark.parametrize(
    ("name", "shipped"), [("ideal", True), ("kit.toml", False), ("kits/mine", False), ("kits\\mine", False)]
)
def test_a_kit_is_a_name_or_a_path(name: str, shipped: bool) -> None:
    assert is_shipped_kit(name) is shipped


def test_tables_of_a_kit_are_inputs_too(bench: Callable[..., Path], make: dict) -> None:
    from deembed.job import load_job

    path = bench(method="solt", arms=False)
    folder = path.parent / "kits"
    f = make["grid"]()
    make["save"](folder, "tables/load.s1p", make["standard"]("load", f))
    text = (path.parent / "kit.toml").read_text()
    text = text.replace('kind = "load"', 'kind = "table"\nfile = "tables/load.s1p"')
    (folder / "kit.toml").write_text(text)
    job = load_job(path).changed({"calibration.kit": "kits/kit.toml"})
    assert ("calibration.kit kits/kit.toml, tables/load.s1p", "kits/tables/load.s1p") in job.input_names()
    assert abs(job.run().part.values - make["part"](f).values).max() < 1e-12
    (folder / "tables/load.s1p").unlink()
    with pytest.raises(
        ValueError,
        match=r"^job\.toml, line 11, calibration\.kit kits/kit\.toml, tables/load\.s1p: 'kits/tables/load",
    ):
        load_job(path).changed({"calibration.kit": "kits/kit.toml"}).run()


def test_findings_are_said_once_and_their_ids_are_their_own() -> None:
    one = Finding("a-part-1", "a", "", "note", "one")
    two = Finding("a-part-1", "a", "", "note", "two")
    assert [(f.id, f.text) for f in _each_once([one, two, one, two])] == [
        ("a-part-1", "one"),
        ("a-part-2", "two"),
    ]


def test_a_file_that_cannot_be_read_is_named(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "a.s1p").write_text("# Hz S RI R 50\n1e9 0.5 0\n")

    def refuse(_: Path) -> bytes:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "read_bytes", refuse)
    with pytest.raises(
        ValueError, match=r"^rounds\[0\]\.file: 'a\.s1p' cannot be read \(Permission denied\)$"
    ):
        Inputs(tmp_path).get("a.s1p", key="rounds[0].file")
