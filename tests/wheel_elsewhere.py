"""Build the wheel, install it in a fresh environment and run the demo from another directory.

Run by `.ci/run`; `python tests/wheel_elsewhere.py` does it by hand.
"""

from __future__ import annotations

import json
import subprocess
import sys
import tempfile
import venv
from pathlib import Path

ROOT = Path(__file__).resolve().parents[1]


def run(*command: object, cwd: Path) -> str:
    done = subprocess.run([str(c) for c in command], cwd=cwd, capture_output=True, text=True)
    if done.returncode:
        sys.exit(f"{' '.join(map(str, command))}\n{done.stdout}{done.stderr}")
    return done.stdout


def main() -> None:
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        run(sys.executable, "-m", "build", "--wheel", "--outdir", folder / "dist", ROOT, cwd=folder)
        (wheel,) = (folder / "dist").glob("*.whl")
        venv.create(folder / "env", with_pip=True)
        python = folder / "env/bin/python"
        run(python, "-m", "pip", "install", "-q", wheel, cwd=folder)
        elsewhere = folder / "elsewhere"
        elsewhere.mkdir()
        where = run(python, "-c", "import deembed, deembed.widgets; print(deembed.__file__)", cwd=elsewhere)
        assert str(folder / "env") in where, f"imported from {where}"
        run(python, "-m", "deembed", "demo", "job", cwd=elsewhere)
        said = run(python, "-m", "deembed", "run", "job/job.toml", "--out", "out", cwd=elsewhere)
        assert json.loads((elsewhere / "out/findings.json").read_text())["version"] == 1
        print(f"{wheel.name}, installed elsewhere: {said.splitlines()[0]}")


if __name__ == "__main__":
    main()
