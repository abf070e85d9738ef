"""Bad kit files: one error that names file, table, key and value and says what to do."""

import re

import pytest

from deembed.errors import FileError, KitError
from deembed.standards import kit_from_text, load_kit

OPEN = '[kit]\nname = "mine"\n[standards.open]\nkind = "open"\n'
CASES = {
    "not toml": ("[kit\n", "mine.toml: not readable as TOML"),
    "nothing": ("", "mine.toml: needs a [kit] table with a name and at least one [standards.NAME] table."),
    "no standards": ('[kit]\nname = "x"\n', "needs a [kit] table with a name and at least one"),
    "no name": ('[kit]\n[standards.o]\nkind = "open"\n', "mine.toml, kit: name is missing. Add it."),
    "stray table": (OPEN + "[standrds]\n", "mine.toml, line 5: unknown key 'standrds'. Did you mean 'standards'?"),
    "unknown key": (
        OPEN + "offset_dely_ps = 3\n",
        "mine.toml, standards.open, line 5: unknown key 'offset_dely_ps'. Did you mean 'offset_delay_ps'?",
    ),
    "key of another kind": (OPEN + "inductance = [1e-12]\n", "standards.open, line 5: unknown key 'inductance'."),
    "unknown kit key": (
        OPEN.replace("[st", 'descripton = "x"\n[st'), "mine.toml, kit, line 3: unknown key 'descripton'. Did you mean",
    ),
    "no kind": (OPEN.replace('kind = "open"', ""), "mine.toml, standards.open: kind is None. Kinds are open, short"),
    "unknown kind": (
        OPEN.replace('"open"', '"opne"'), "standards.open: kind is 'opne'. Did you mean 'open'? Kinds are open,",
    ),
    "negative delay": (
        OPEN + "offset_delay_ps = -3.0\n", "standards.open, line 5: offset_delay_ps = -3.0: Input should be greater",
    ),
    "not a number": (OPEN + 'offset_delay_ps = "long"\n', "offset_delay_ps = 'long': Input should be a valid number"),
    "infinite": (OPEN + "offset_delay_ps = inf\n", "offset_delay_ps = inf: Input should be a finite number"),
    "band the wrong way": (OPEN + "valid_hz = [9e9, 1e9]\n", "standards.open: valid_hz runs from 9e+09 to 1e+09 Hz"),
    "two lengths": (
        OPEN + '[standards.thru]\nkind = "thru"\ndelay_ps = 1.0\nlength_m = 0.01\n',
        "standards.thru: delay_ps and length_m are both given; keep one",
    ),
    "line without length": (OPEN + '[standards.l]\nkind = "line"\n', "standards.l: length_m is missing. Add it."),
    "permittivity below one": (
        OPEN + '[standards.l]\nkind = "line"\nlength_m = 1.0\neffective_permittivity = 0.5\n',
        "effective_permittivity = 0.5: Input should be greater than or equal to 1",
    ),
    "sign": (OPEN + '[standards.r]\nkind = "reflect"\nsign = 0\n', "sign = 0: Input should be 1 or -1"),
    "reserved name": (OPEN + '[standards.isolation]\nkind = "load"\n', "the name isolation is reserved"),
    "reference": (OPEN.replace("[st", "reference_impedance_ohm = 0\n[st"), "reference_impedance_ohm = 0: Input should"),
}  # fmt: skip


@pytest.mark.parametrize("case", CASES)
def test_it_says_what_where_and_what_to_do(case):
    text, message = CASES[case]
    with pytest.raises(KitError, match=re.escape(message)):
        kit_from_text(text, where="mine.toml")


def test_an_unknown_kit_names_the_nearest():
    with pytest.raises(
        KitError, match=r"no kit is called 'ideall'\. Did you mean 'ideal'\? Shipped are demo-board-lines,"
    ):
        load_kit("ideall")


def test_files_that_are_not_there_or_not_text(tmp_path):
    with pytest.raises(FileError, match=r"nowhere\.toml: there is no such file\. Check the path of the kit"):
        load_kit(tmp_path / "nowhere.toml")
    (tmp_path / "x.toml").write_bytes(b"\xff\xfe")
    with pytest.raises(FileError, match=r"x\.toml: cannot be read"):
        load_kit(tmp_path / "x.toml")
