"""Kits: loaded, changed, and what their standards answer."""

import re

import numpy as np
import pytest
import xarray as xr

import deembed
from deembed.errors import FileError, GridError, KitError
from deembed.labels import ports_of, sparams
from deembed.standards import kit_from_text, load_kit, shipped_kits
from deembed.touchstone import write_touchstone

F = np.linspace(0, 9e9, 91)
HEAD = '[kit]\nname = "mine"\n'


def kit(body, **more):
    return kit_from_text(HEAD + body, where="mine.toml", **more)


def test_the_kits_that_come_with_the_package():
    assert shipped_kits() == ["demo-board-lines", "generic-coax-3p5mm", "generic-coax-n-type", "ideal"]


@pytest.mark.parametrize("name", shipped_kits())
def test_every_shipped_standard_is_passive_and_says_what_it_is(name):
    own = load_kit(name)
    assert own.name == name and own.description
    for standard in own.standards:
        s = own.response(standard, F)
        gain = np.linalg.svd(s.values, compute_uv=False).max()
        assert gain <= 1 + 1e-9, standard
        assert np.isfinite(s.values).all()
        np.testing.assert_array_equal(s.values, s.values.swapaxes(-1, -2))


def test_ideal_standards_are_ideal():
    own = load_kit("ideal")
    for standard, value in (("open", 1), ("short", -1), ("load", 0), ("reflect", -1)):
        np.testing.assert_array_equal(own.response(standard, F).values[:, 0, 0], value)
    np.testing.assert_array_equal(
        own.response("thru", F).values, np.broadcast_to([[0, 1], [1, 0]], (91, 2, 2))
    )


def test_defaults_are_plain_and_impedances_follow_the_kit():
    own = kit('reference_impedance_ohm = 75.0\n[standards.l]\nkind = "load"\n[standards.o]\nkind = "open"\n')
    np.testing.assert_array_equal(own.response("l", F).values, 0)
    np.testing.assert_allclose(own.response("l", F, z0=50.0).values, 0.2, atol=1e-15)
    np.testing.assert_allclose(own.response("o", F, z0=50.0).values, 1.0, atol=1e-15)
    np.testing.assert_array_equal(own.response("l", F).z0, 75)
    np.testing.assert_array_equal(own.response("l", F, z0=50.0).z0, 50)


def test_parameters_reach_the_model():
    text = (
        '[standards.o]\nkind = "open"\noffset_delay_ps = 30.0\ncapacitance = [50e-15, 1e-24]\n'
        '[standards.s]\nkind = "short"\ninductance = [2e-12]\noffset_loss_gohm_per_s = 2.0\noffset_delay_ps = 10.0\n'
        '[standards.l]\nkind = "load"\nresistance_ohm = 51.0\ninductance_h = 1e-12\noffset_impedance_ohm = 60.0\n'
        '[standards.r]\nkind = "reflect"\nsign = 1\noffset_delay_ps = 5.0\n'
        '[standards.t]\nkind = "thru"\ndelay_ps = 12.0\n'
    )
    own = kit(text)
    f, w = 4e9, 2 * np.pi * 4e9
    y = 1j * w * (50e-15 + 1e-24 * f) * 50
    opened = (1 - y) / (1 + y) * np.exp(-2j * w * 30e-12)
    assert own.response("o", [f]).values.item() == pytest.approx(opened)
    a, zc = 2e9 * 10e-12 * 2 / 100, 50 + (1 - 1j) * 2e9 / (2 * w) * 2
    z = 1j * w * 2e-12
    seen = (z - zc) / (z + zc) * np.exp(-2 * (1j * w * 10e-12 + (1 + 1j) * a))
    zin = zc * (1 + seen) / (1 - seen)
    assert own.response("s", [f]).values.item() == pytest.approx((zin - 50) / (zin + 50))
    z = 51 + 1j * w * 1e-12
    assert own.response("l", [f]).values.item() == pytest.approx((z - 50) / (z + 50))
    assert own.response("r", [f]).values.item() == pytest.approx(np.exp(-2j * w * 5e-12))
    assert own.response("t", [f]).values[0, 1, 0] == pytest.approx(np.exp(-1j * w * 12e-12))


def test_lines_by_length_and_their_impedance():
    own = kit(
        '[standards.a]\nkind = "line"\nlength_m = 0.03\neffective_permittivity = 4.0\nimpedance_ohm = 60.0\n'
        '[standards.t]\nkind = "thru"\nlength_m = 0.01\n[standards.z]\nkind = "thru"\n'
        '[standards.d]\nkind = "thru"\ndelay_ps = 3.0\n[standards.o]\nkind = "open"\n'
    )
    f = 2.5e9
    e = np.exp(-2j * np.pi * f * 0.03 * 2 / 299_792_458)
    assert own.transmission("a", [f]).item() == pytest.approx(e)
    g = 10 / 110
    assert own.response("a", [f]).values[0, 0, 0] == pytest.approx(g * (1 - e**2) / (1 - g**2 * e**2))
    assert [own.length(n) for n in "atzd"] == [0.03, 0.01, 0.0, None]
    assert own.length("o") is None
    with pytest.raises(KitError, match="kit mine: o passes nothing on"):
        own.transmission("o", [f])


def test_a_parameter_may_have_draws():
    own = load_kit("generic-coax-3p5mm")
    draws = xr.DataArray([30.0, 31.0, 32.0], dims="draw", coords={"draw": [7, 8, 9]})
    many = own.changed("open", offset_delay_ps=draws).response("open", F)
    assert many.dims == ("draw", "frequency", "port_out", "port_in") and list(many.draw) == [7, 8, 9]
    one = own.changed("open", offset_delay_ps=31.0).response("open", F)
    np.testing.assert_allclose(many.sel(draw=8).values, one.values, atol=1e-15)
    lines = load_kit("demo-board-lines").changed("line", length_m=xr.DataArray([0.01, 0.02], dims="draw"))
    assert lines.transmission("line", F[1:]).dims == ("draw", "frequency")
    assert lines.response("line", F[1:]).sizes["draw"] == 2
    coefficients = own.changed("open", capacitance=(draws * 1e-15, 0.0))
    assert coefficients.response("open", F).sizes["draw"] == 3


def test_a_change_leaves_the_kit_as_it_was():
    own = load_kit("ideal")
    other = own.changed("load", resistance_ohm=55.0)
    assert own.response("load", F).values[0, 0, 0] == 0
    assert other.response("load", F).values[0, 0, 0] == pytest.approx(5 / 105)
    with pytest.raises(
        KitError, match=re.escape("standards.load: no parameter 'resistence_ohm'. Did you mean 'resist")
    ):
        own.changed("load", resistence_ohm=1.0)
    with pytest.raises(KitError, match="no parameter 'kind'"):
        own.changed("load", kind="open")


def test_use_outside_the_stated_band_is_a_finding():
    own = kit('[standards.o]\nkind = "open"\nvalid_hz = [1e9, 6e9]\n[standards.s]\nkind = "short"\n')
    found = own.validity_findings("o", F, where="open 1")
    assert [(f.kind, f.where, f.severity, f.from_hz, f.to_hz) for f in found] == [
        ("outside-validity", "open 1", "warning", 0.0, 0.9e9),
        ("outside-validity", "open 1", "warning", 6.1e9, 9e9),
    ]
    assert found[1].text == (
        "The definition of open 1 is used at 6.1 to 9 GHz, outside the 1 to 6 GHz that kit mine states for it."
    )
    assert (found[0].worst, found[0].worst_hz, found[1].worst, found[1].worst_hz) == (1e9, 0.0, 3e9, 9e9)
    assert own.validity_findings("s", F, where="short 1") == []
    assert own.validity_findings("o", [1e9, 6e9], where="open 1") == []


def test_an_unknown_standard_names_the_nearest():
    own = load_kit("ideal")
    for act in (own.kind, lambda s: own.response(s, F), lambda s: own.validity_findings(s, F, where="")):
        with pytest.raises(
            KitError, match="kit ideal: no standard 'opn'. Did you mean 'open'. It has open, short, load"
        ):
            act("opn")


def test_a_tabulated_standard(tmp_path):
    f = np.linspace(1e9, 2e9, 11)
    table = sparams(np.full((11, 1, 1), 0.01 + 0.02j), f)
    (tmp_path / "tables").mkdir()
    write_touchstone(table, tmp_path / "tables/load.s1p")
    two = sparams(np.tile([[0.0, 0.9], [0.9, 0.0]], (11, 1, 1)), f, ports=[3, 4])
    write_touchstone(two, tmp_path / "tables/thru.s2p")
    path = tmp_path / "mine.toml"
    path.write_text(
        HEAD + '[standards.load]\nkind = "table"\nfile = "tables/load.s1p"\n'
        '[standards.thru]\nkind = "table"\nfile = "tables/thru.s2p"\n'
    )
    own = deembed.load_kit(path)
    np.testing.assert_array_equal(own.response("load", f).values, table.values)
    some = own.response("load", f[3:5])
    np.testing.assert_array_equal(some.frequency, f[3:5])
    assert ports_of(own.response("thru", f)) == (1, 2)
    np.testing.assert_array_equal(own.transmission("thru", f), 0.9)
    with pytest.raises(
        GridError, match=re.escape("standards.load: the table has 11 points, 1 GHz to 2 GHz; the read")
    ):
        own.response("load", [1.05e9])
    with pytest.raises(KitError, match="cannot be read from here"):
        kit('[standards.x]\nkind = "table"\nfile = "x.s1p"\n')
    with pytest.raises(KitError, match="'x.s3p' has 3 ports. Give one or two"):
        kit(
            '[standards.x]\nkind = "table"\nfile = "x.s3p"\n',
            read_table=lambda path: sparams(np.zeros((1, 3, 3)), [1e9]),
        )
    (tmp_path / "tables/load.s1p").unlink()
    with pytest.raises(FileError, match=r"load\.s1p: there is no such file"):
        deembed.load_kit(path)
