"""Plant small faults one at a time in `deembed/` and count how many make a test fail.

    python tests/faults/plant_faults.py --count 40 --seed 1 --workers 2

Works on copies of the tree; the tree itself is never changed. Kinds: sign, index, conjugate, transpose, unit,
comparison. Faults are drawn at random from every such place in the package, one kind after another, so that no
kind crowds out the rest. Each is tried first against the tests that mirror its file, then against all but the
browser walks.
"""

from __future__ import annotations

import argparse
import ast
import json
import os
import random
import shutil
import subprocess
import sys
import tempfile
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]
KINDS = ("sign", "index", "conjugate", "transpose", "unit", "comparison")
SKIPPED = ("__init__.py", "__main__.py")


class Plant(ast.NodeTransformer):
    """Changes the `target`-th place of one kind; with no target it only counts the places."""

    def __init__(self, kind: str, target: int | None = None) -> None:
        self.kind, self.target, self.seen, self.what = kind, target, 0, ""

    def _here(self, node: ast.AST, what: str) -> bool:
        self.seen += 1
        if self.target is not None and self.seen - 1 == self.target:
            self.what = f"line {node.lineno}: {what}"
            return True
        return False

    def visit_arg(self, node):
        return node  # a changed annotation changes nothing

    def visit_FunctionDef(self, node):
        node.args = self.visit(node.args)
        node.body = [self.visit(part) for part in node.body]
        return node

    def visit_AnnAssign(self, node):
        if node.value is not None:
            node.value = self.visit(node.value)
        return node

    def visit_BinOp(self, node):
        self.generic_visit(node)
        swap = {ast.Add: ast.Sub, ast.Sub: ast.Add}.get(type(node.op))
        text = isinstance(node.left, ast.Constant | ast.JoinedStr) and not _number(node.left)
        if (
            self.kind == "sign"
            and swap
            and not text
            and self._here(node, f"{ast.unparse(node)} with its sign flipped")
        ):
            node.op = swap()
        if self.kind == "transpose" and isinstance(node.op, ast.MatMult):
            if self._here(node, f"{ast.unparse(node)} in the other order"):
                node.left, node.right = node.right, node.left
        return node

    def visit_UnaryOp(self, node):
        self.generic_visit(node)
        if (
            self.kind == "sign"
            and isinstance(node.op, ast.USub)
            and not isinstance(node.operand, ast.Constant)
        ):
            if self._here(node, f"{ast.unparse(node)} without its minus"):
                return node.operand
        return node

    def visit_Subscript(self, node):
        self.generic_visit(node)
        if self.kind == "index" and isinstance(node.slice, ast.Tuple) and len(node.slice.elts) >= 2:
            *rest, a, b = node.slice.elts
            # A new axis may stand on either side of a number: that changes nothing.
            numbered = not any(isinstance(e, ast.Constant) and e.value is None for e in (a, b))
            if (
                numbered
                and ast.dump(a) != ast.dump(b)
                and self._here(node, f"{ast.unparse(node)} with its last indices swapped")
            ):
                node.slice.elts = [*rest, b, a]
        return node

    def visit_Call(self, node):
        self.generic_visit(node)
        name = ast.unparse(node.func)
        if self.kind == "conjugate" and name.rsplit(".", 1)[-1] in ("conj", "conjugate"):
            if self._here(node, f"{ast.unparse(node)} without the conjugate"):
                return node.args[0] if node.args else node.func.value
        if self.kind == "conjugate" and name in ("np.exp", "inverse", "np.angle", "np.unwrap"):
            if self._here(node, f"{ast.unparse(node)} of the conjugate"):
                node.args[0] = ast.parse(f"np.conj({ast.unparse(node.args[0])})", mode="eval").body
        method = isinstance(node.func, ast.Attribute) and node.func.attr in ("swapaxes", "transpose")
        if self.kind == "transpose" and method and len(node.args) >= 2 and not name.startswith("np."):
            if self._here(node, f"{ast.unparse(node)} left out"):
                return node.func.value
        return node.func.value if name.endswith(".swapaxes") else node
        return node

    def visit_Attribute(self, node):
        self.generic_visit(node)
        if self.kind == "transpose" and node.attr in ("T", "mT"):
            if self._here(node, f"{ast.unparse(node)} not transposed"):
                return node.value
        return node

    def visit_Constant(self, node):
        if (
            self.kind == "unit"
            and _number(node)
            and abs(node.value) not in (0, 1)
            and isinstance(node.value, float)
        ):
            if self._here(node, f"{node.value!r} times 1000"):
                node.value = node.value * 1000
        return node

    def visit_Compare(self, node):
        self.generic_visit(node)
        swap = {ast.Lt: ast.Gt, ast.Gt: ast.Lt, ast.LtE: ast.GtE, ast.GtE: ast.LtE, ast.Eq: ast.NotEq}
        op = type(node.ops[0])
        if (
            self.kind == "comparison"
            and op in swap
            and self._here(node, f"{ast.unparse(node)} the other way round")
        ):
            node.ops[0] = swap[op]()
        return node


def _number(node: ast.AST) -> bool:
    return (
        isinstance(node, ast.Constant)
        and isinstance(node.value, int | float)
        and not isinstance(node.value, bool)
    )


def places(kind: str) -> list[tuple[Path, int]]:
    """Every (file, number) where this kind of fault can be planted."""
    found = []
    for path in sorted((ROOT / "deembed").rglob("*.py")):
        if path.name in SKIPPED:
            continue
        counter = Plant(kind)
        counter.visit(ast.parse(path.read_text()))
        found += [(path.relative_to(ROOT), n) for n in range(counter.seen)]
    return found


def draw(count: int, seed: int) -> list[tuple[str, Path, int]]:
    """Faults drawn kind after kind, without repeats."""
    rng = random.Random(seed)
    pools = {kind: places(kind) for kind in KINDS}
    for pool in pools.values():
        rng.shuffle(pool)
    chosen = []
    while len(chosen) < count and any(pools.values()):
        for kind in KINDS:
            if pools[kind] and len(chosen) < count:
                chosen.append((kind, *pools[kind].pop()))
    return chosen


def mirrored(path: Path) -> list[str]:
    """Tests that mirror a source file, nearest first."""
    inside = path.relative_to("deembed")
    folder = Path("tests") / inside.parent
    near = sorted(str(p) for p in (ROOT / folder).glob(f"test_*{inside.stem}*.py"))
    return [str(Path(p).relative_to(ROOT)) for p in near] + ([str(folder)] if inside.parent.parts else [])


def run_tests(tree: Path, targets: list[str]) -> bool:
    """True when the tests pass."""
    env = {**os.environ, "PYTHONPATH": str(tree), "DEEMBED_MEASURED": str(ROOT.parent / "shared/measured")}
    env.pop("CI", None)
    command = [sys.executable, "-m", "pytest", "-q", "-x", "-m", "not browser and not slow", *targets]
    done = subprocess.run(command, cwd=tree, env=env, capture_output=True, text=True, timeout=900)
    return done.returncode in (0, 5)


def copy_tree(folder: Path) -> None:
    for name in ("deembed", "widgets", "standards_defs", "tests", "docs", "notebooks"):
        shutil.copytree(ROOT / name, folder / name, ignore=shutil.ignore_patterns("__pycache__"))
    for name in ("pyproject.toml", "README.md", "DEVELOPERS.md"):
        shutil.copy(ROOT / name, folder / name)
    # The copy must be what is imported, sub-packages kept elsewhere included.
    (folder / "deembed/widgets").symlink_to(folder / "widgets")
    (folder / "deembed/standards_defs").symlink_to(folder / "standards_defs")


def try_fault(fault: tuple[str, Path, int]) -> dict:
    """Plant one fault in a copy and see whether a test fails."""
    kind, path, number = fault
    with tempfile.TemporaryDirectory() as name:
        tree = Path(name)
        copy_tree(tree)
        plant = Plant(kind, number)
        changed = plant.visit(ast.parse((ROOT / path).read_text()))
        (tree / path).write_text(ast.unparse(ast.fix_missing_locations(changed)))
        near = mirrored(path)
        caught = (bool(near) and not run_tests(tree, near)) or not run_tests(tree, [])
    result = {"kind": kind, "file": str(path), "what": plant.what, "caught": caught}
    print(("caught  " if caught else "MISSED  ") + f"{kind:<11}{path} {plant.what}", flush=True)
    return result


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--count", type=int, default=40)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--workers", type=int, default=2)
    parser.add_argument("--needed", type=float, default=0.9, help="share that must be caught")
    parser.add_argument("--json", type=Path, help="write the results here")
    options = parser.parse_args()
    with tempfile.TemporaryDirectory() as name:
        copy_tree(Path(name))
        if not run_tests(Path(name), []):
            print("the tests fail without any fault: mend that first", file=sys.stderr)
            return 2
    with ThreadPoolExecutor(options.workers) as pool:
        results = list(pool.map(try_fault, draw(options.count, options.seed)))
    caught = sum(r["caught"] for r in results)
    print(f"{caught} of {len(results)} planted faults made a test fail")
    if options.json:
        options.json.write_text(json.dumps(results, indent=1))
    return 0 if caught >= options.needed * len(results) else 1


if __name__ == "__main__":
    sys.exit(main())
