"""The kernels never loop over frequency: a syntax-tree check, and a check of the check."""

import ast
from pathlib import Path

import pytest

NUMERIC = Path(__file__).parents[2] / "deembed/numeric"
# A loop in a kernel may run over these only: counts that do not grow with the sweep.
SHORT = (
    "port",
    "pair",
    "drive",
    "receive",
    "standard",
    "term",
    "step",
    "line",
    "round",
    "block",
    "arm",
    "order",
)
BANNED_CALLS = ("vectorize", "apply_along_axis", "frompyfunc", "nditer", "ndenumerate", "ndindex")


def loops(tree):
    for node in ast.walk(tree):
        if isinstance(node, ast.While):
            yield node, "while", ""
        elif isinstance(node, ast.For | ast.comprehension):
            yield node, ast.unparse(node.target), ast.unparse(node.iter)


def is_short(target, source):
    if any(word in source.lower() or word in target.lower() for word in SHORT):
        return True
    if source.startswith("range(") and source[6:-1].replace(" ", "").replace(",", "").isdigit():
        return int(source[6:-1].split(",")[-1]) <= 20
    if source.startswith("range("):  # range(n): n must be a count of ports, taken from the last axis
        return source in ("range(n)", "range(n_ports)")
    return source.startswith(("(", "["))  # a literal


def offences(text):
    tree = ast.parse(text)
    found = []
    for node, target, source in loops(tree):
        if target == "while" or "freq" in f"{target}{source}".lower() or not is_short(target, source):
            line = getattr(node, "lineno", getattr(getattr(node, "iter", None), "lineno", 0))
            found.append(f"line {line}: for {target} in {source}")
    for node in ast.walk(tree):
        if isinstance(node, ast.Call):
            name = ast.unparse(node.func).rsplit(".", 1)[-1]
            if name in BANNED_CALLS or (name == "map" and isinstance(node.func, ast.Name)):
                found.append(f"line {node.lineno}: {name}()")
    return found


@pytest.mark.parametrize("path", sorted(NUMERIC.rglob("*.py")), ids=lambda p: p.stem)
def test_no_loop_over_frequency(path):
    assert offences(path.read_text()) == []


@pytest.mark.parametrize(
    "text",
    [
        "for k in range(frequency.size): pass",
        "for m in s: pass",
        "while True: pass",
        "[inv(m) for m in matrices]",
        "for i in range(len(s)): pass",
        "for i in range(s.shape[0]): pass",
        "np.vectorize(f)(s)",
        "list(map(inv, s))",
        "np.apply_along_axis(f, 0, s)",
    ],
)
def test_the_check_sees_a_loop(text):
    assert len(offences(text)) == 1
