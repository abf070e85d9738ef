"""Bad Touchstone files: one error that names file and line and says what to do."""

import re

import pytest

import deembed
from deembed.errors import FileError
from deembed.touchstone import parse_touchstone

HEAD = "! a comment\n# GHz S RI R 50\n"
V2 = "[Version] 2.0\n# GHz S RI R 50\n[Number of Ports] {n}\n{order}[Number of Frequencies] {k}\n{more}[Network Data]\n"


def v2(n=1, k=1, order="", more="", data="1 0 0\n"):
    return V2.format(n=n, k=k, order=order, more=more) + data + "[End]\n"


CASES = {
    "too few columns": (
        "x.s2p",
        HEAD + "1 0 0 0 0 0 0 0 0\n2 0 0 0 0 0 0\n",
        "x.s2p, line 4: 7 columns; a line of a 2-port file has 9. Check the number of ports in the file name",
    ),
    "a one-port named two": (
        "x.s2p", HEAD + "1 0.1 0.2\n2 0.1 0.2\n", "x.s2p, line 3: 3 columns; a line of a 2-port file has 9.",
    ),
    "a two-port named three": (
        "x.s3p",
        HEAD + "1 0 0 0 0 0 0 0 0\n2 0 0 0 0 0 0 0 0\n",
        "x.s3p, line 4: 9 columns here, while the point that starts at line 3 has 9 numbers so far; "
        "a 3-port point has 19.",
    ),
    "a row too many": (
        "x.s3p",
        HEAD + "1 0 0 0 0 0 0\n0 0 0 0 0 0\n0 0 0 0 0 0\n0 0 0 0 0 0\n",
        "x.s3p, line 6: 6 columns; a line of a 3-port file has at most 9.",
    ),
    "cut short": (
        "x.s3p",
        HEAD + "1 0 0 0 0 0 0\n0 0 0 0 0 0\n",
        "x.s3p, line 3: the last point has 13 numbers; a 3-port point has 19. The file is cut short",
    ),
    "not a number": (
        "x.s1p", HEAD + "1 0.1 0.2\n2 0.1 O.2\n", "x.s1p, line 4: 'O.2' is not a number. Correct that line.",
    ),
    "nan": (
        "x.s1p", HEAD + "1 0.1 0.2\n2 nan 0\n", "x.s1p, line 4: nan stands where a number is needed. Read that point",
    ),
    "infinite": ("x.s1p", HEAD + "1 inf 0.2\n", "x.s1p, line 3: inf stands where a number is needed."),
    "repeated frequency": (
        "x.s1p",
        HEAD + "1 0 0\n2 0 0\n2 0 0\n",
        "x.s1p, line 5: the frequency repeats: 2 GHz after 2 GHz of line 4. Sort the points and remove repeats.",
    ),
    "falling frequency": (
        "x.s1p", HEAD + "1 0 0\n3 0 0\n2 0 0\n", "x.s1p, line 5: the frequency falls: 2 GHz after 3 GHz of line 4.",
    ),
    "negative frequency": ("x.s1p", HEAD + "-1 0 0\n", "x.s1p, line 3: frequency -1e+09 Hz. It must be 0 up."),
    "no unit": (
        "x.s1p",
        "# S RI R 50\n1 0 0\n",
        "x.s1p, line 1: the option line '# S RI R 50' names no frequency unit. Add Hz, kHz, MHz or GHz",
    ),
    "unknown unit": (
        "x.s1p", "# THz S RI R 50\n1 0 0\n", "x.s1p, line 1: 'THZ' in the option line is not understood.",
    ),
    "no option line": (
        "x.s1p", "! only a comment\n1 0 0\n", "x.s1p, line 2: there is no option line (such as '# GHz S RI R 50')",
    ),
    "two option lines": (
        "x.s1p", HEAD + "# Hz S RI R 50\n1 0 0\n", "x.s1p, line 3: a second option line differs from that of line 2.",
    ),
    "no resistance": ("x.s1p", "# GHz S RI R 0\n1 0 0\n", "x.s1p, line 1: reference resistance 0 ohm."),
    "empty": ("x.s1p", "", "x.s1p: holds no data. Check that the file is complete."),
    "no ports in the name": (
        "x.txt", HEAD + "1 0 0\n", "x.txt: the number of ports is not known. Let the name end in .s1p, .s2p",
    ),
    "too many ports": ("x.s13p", HEAD + "1 0 0\n", "x.s13p: 13 ports. 1 to 12 can be read."),
    "hybrid of three": (
        "x.s3p",
        "# GHz H RI R 50\n1 0 0 0 0 0 0\n0 0 0 0 0 0\n0 0 0 0 0 0\n",
        "x.s3p: H-parameters of 3 ports. They exist for two ports only.",
    ),
    "name against contents": ("x.s2p", v2(), "x.s2p: the name says 2 ports, [Number of Ports] says 1."),
    "no order": (
        "x.s2p", v2(n=2, data="1 0 0 0 0 0 0 0 0\n"), "x.s2p: [Two-Port Data Order] is missing. Add 12_21 or 21_12.",
    ),
    "wrong order": (
        "x.s2p", v2(n=2, order="[Two-Port Data Order] 11_22\n"), "x.s2p, line 4: [Two-Port Data Order] is '11_22'.",
    ),
    "unknown keyword": (
        "x.s1p", v2(more="[Refrence] 50\n"), "x.s1p, line 5: unknown keyword [Refrence]. Did you mean [reference]?",
    ),
    "other version": ("x.s1p", v2().replace("2.0", "3.0"), "x.s1p, line 1: version '3.0'. Versions 1.1"),
    "count of frequencies": (
        "x.s1p", v2(k=2), "x.s1p: [Number of Frequencies] is 2, and there are 1 points. The file is cut short",
    ),
    "count that is none": ("x.s1p", v2(k="many"), "x.s1p, line 4: 'many' is not a count."),
    "references": ("x.s1p", v2(more="[Reference] 50 50\n"), "x.s1p: [Reference] has 2 values for 1 ports."),
    "reference not a number": ("x.s1p", v2(more="[Reference] fifty\n"), "x.s1p, line 5: 'fifty' is not a number."),
    "mixed mode": ("x.s1p", v2(more="[Mixed-Mode Order] D2,3\n"), "x.s1p, line 5: mixed-mode data cannot be read."),
    "matrix format": ("x.s1p", v2(more="[Matrix Format] Half\n"), "x.s1p, line 5: [Matrix Format] is 'Half'."),
    "ports missing": (
        "x.s1p", v2().replace("[Number of Ports] 1\n", ""), "x.s1p: [Number of Ports] is missing. Add it.",
    ),
}  # fmt: skip


@pytest.mark.parametrize("case", CASES)
def test_it_says_what_where_and_what_to_do(case):
    name, text, message = CASES[case]
    with pytest.raises(FileError, match=re.escape(message)):
        parse_touchstone(text, name=name)


def test_a_missing_file(tmp_path):
    with pytest.raises(FileError, match=re.escape("nowhere.s1p: there is no such file. Check the path.")):
        deembed.read_touchstone(tmp_path / "nowhere.s1p")


def test_a_file_that_is_no_text(tmp_path):
    (tmp_path / "x.s1p").write_bytes(b"\xff\xfe\x00\x01")
    with pytest.raises(FileError, match=r"x\.s1p: is not text\. Give a Touchstone file"):
        deembed.read_touchstone(tmp_path / "x.s1p")


def test_a_folder_is_no_file(tmp_path):
    with pytest.raises(FileError, match="cannot be read"):
        deembed.read_touchstone(tmp_path)
