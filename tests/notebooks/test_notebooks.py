"""Every notebook runs from top to bottom, and is kept without outputs."""

import json
import shutil
from pathlib import Path

import nbformat
import pytest
from nbclient import NotebookClient

NOTEBOOKS = sorted((Path(__file__).parents[2] / "notebooks").glob("*.ipynb"))


def test_there_are_notebooks():
    assert [p.name for p in NOTEBOOKS] == ["start_here.ipynb"]


@pytest.mark.parametrize("path", NOTEBOOKS, ids=lambda p: p.stem)
def test_it_is_kept_without_outputs(path):
    cells = json.loads(path.read_text())["cells"]
    assert all(c.get("outputs", []) == [] and c.get("execution_count") is None for c in cells)


@pytest.mark.filterwarnings("ignore::DeprecationWarning")
@pytest.mark.parametrize("path", NOTEBOOKS, ids=lambda p: p.stem)
def test_it_runs(path, tmp_path):
    shutil.copy(path, tmp_path)
    notebook = nbformat.read(path, as_version=4)
    NotebookClient(notebook, timeout=120, resources={"metadata": {"path": str(tmp_path)}}).execute()
    shown = [o.get("data", {}) for c in notebook.cells for o in c.get("outputs", [])]
    assert sum("application/vnd.jupyter.widget-view+json" in d for d in shown) == 1  # the lane map
    assert ["<svg" in d["image/svg+xml"] for d in shown if "image/svg+xml" in d] == [True]
    assert not any("Figure(" in d.get("text/plain", "") for d in shown)  # a picture, not its name
    said = "".join(o.get("text", "") for c in notebook.cells for o in c.get("outputs", []))
    assert "Physical as far as these readings can show" in said
    assert "open 2, short 2" in said
