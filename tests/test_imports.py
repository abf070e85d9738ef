"""What `import deembed` costs, and which way imports run."""

import ast
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
HEAVY = ("matplotlib", "ipywidgets", "skrf", "pandas")


def modules_after(statement):
    code = f"{statement}\nimport sys\nprint(*sys.modules)"
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True, cwd=ROOT.parent
    )
    return set(done.stdout.split())


def test_import_loads_nothing_heavy():
    loaded = modules_after("import deembed")
    assert not loaded & set(HEAVY)


def test_the_solvers_load_no_drawing_and_no_touchstone_reader():
    loaded = modules_after("import deembed; deembed.solve_solt; deembed.assess; deembed.load_kit")
    assert not loaded & {"matplotlib", "ipywidgets", "skrf"}


@pytest.mark.parametrize("name", __import__("deembed").__all__)
def test_every_public_name_loads(name):
    assert getattr(__import__("deembed"), name) is not None


def imports_of(path):
    for node in ast.walk(ast.parse(path.read_text())):
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom) and node.module:
            yield node.module
            yield from (f"{node.module}.{alias.name}" for alias in node.names)


def test_numeric_knows_only_numpy_and_scipy():
    allowed = {"numpy", "scipy", "__future__", *sys.stdlib_module_names}
    stray = [
        f"{path.name}: {name}"
        for path in sorted((ROOT / "deembed/numeric").rglob("*.py"))
        for name in imports_of(path)
        if name != "deembed.numeric"
        and not name.startswith("deembed.numeric.")
        and name.split(".")[0] not in allowed
    ]
    assert stray == []


def test_the_computation_imports_no_widget():
    stray = [
        f"{path.name}: {name}"
        for path in sorted((ROOT / "deembed").rglob("*.py"))
        for name in imports_of(path)
        if name.startswith(("deembed.widgets", "ipywidgets", "widgets"))
    ]
    assert stray == []


def test_simulate_imports_no_suspects_and_no_solver():
    stray = [
        f"{path.name}: {name}"
        for path in sorted((ROOT / "deembed/simulate").rglob("*.py"))
        for name in imports_of(path)
        if name.startswith(("deembed.suspects", "deembed.calibration"))
    ]
    assert stray == []


def import_graph():
    paths = {path: path.relative_to(ROOT).with_suffix("") for path in (ROOT / "deembed").rglob("*.py")}
    names = {".".join(p.parts).removesuffix(".__init__"): path for path, p in paths.items()}
    graph = {}
    for name, path in names.items():
        tree = ast.parse(path.read_text())
        top = [n for n in tree.body if isinstance(n, ast.ImportFrom | ast.Import)]
        wanted = set()
        for node in top:
            found = [a.name for a in node.names]
            if isinstance(node, ast.ImportFrom) and node.module:
                found = [node.module, *(f"{node.module}.{a}" for a in found)]
            wanted |= {f for f in found if f in names and f != name}
        graph[name] = wanted
    return graph


def test_imports_run_one_way():
    graph = import_graph()
    done, under_way = set(), []

    def visit(name):
        if name in done:
            return
        assert name not in under_way, f"circle: {' -> '.join([*under_way[under_way.index(name) :], name])}"
        under_way.append(name)
        for other in sorted(graph[name]):
            if not name.startswith(f"{other}.") and not other.startswith(f"{name}."):
                visit(other)
        under_way.pop()
        done.add(name)

    for name in sorted(graph):
        visit(name)
    assert len(done) > 30
