"""Touchstone in and out, against scikit-rf and the format's own rules (Touchstone 1.1, 2.0, 2.1; IBIS Open Forum)."""

import numpy as np
import pytest
import skrf
from hypothesis import given
from hypothesis import strategies as st

import deembed
from deembed.errors import FileError
from deembed.labels import ports_of, sparams
from deembed.touchstone import parse_touchstone, touchstone_text, write_touchstone

F = np.linspace(1e9, 2e9, 5)


def random_s(n, rng, *, z0=50.0, ports=None):
    return sparams(rng.normal(size=(5, n, n)) + 1j * rng.normal(size=(5, n, n)), F, z0=z0, ports=ports)


@pytest.mark.parametrize("version", ["1.1", "2.0"])
@pytest.mark.parametrize("ports", range(1, 13))
def test_what_is_written_comes_back_to_the_last_bit(ports, version, rng, tmp_path):
    s = random_s(ports, rng, z0=75.0)
    path = tmp_path / f"part.s{ports}p"
    write_touchstone(s, path, version=version, provenance=["river gauge"])
    back = deembed.read_touchstone(path)
    np.testing.assert_array_equal(back.values, s.values)
    np.testing.assert_array_equal(back.frequency, s.frequency)
    np.testing.assert_array_equal(back.z0, s.z0)
    assert back.attrs["comments"] == "river gauge"


@pytest.mark.parametrize("ports", [1, 2, 3, 4, 7])
def test_scikit_rf_reads_what_is_written(ports, rng, tmp_path):
    s = random_s(ports, rng)
    path = tmp_path / f"part.s{ports}p"
    write_touchstone(s, path)
    network = skrf.Network(str(path))
    np.testing.assert_allclose(network.s, s.values, atol=1e-12)
    np.testing.assert_allclose(network.f, F, rtol=1e-15)


@pytest.mark.parametrize("form", ["ri", "ma", "db"])
@pytest.mark.parametrize("unit", ["Hz", "kHz", "MHz", "GHz"])
@pytest.mark.parametrize("ports", [1, 2, 3, 5])
def test_what_scikit_rf_writes_is_read(ports, unit, form, rng, tmp_path):
    s = random_s(ports, rng)
    network = skrf.Network(f=F, f_unit="Hz", s=s.values, z0=50)
    network.frequency.unit = unit
    network.write_touchstone("part", dir=tmp_path, form=form)
    back = deembed.read_touchstone(tmp_path / f"part.s{ports}p")
    np.testing.assert_allclose(back.values, s.values, atol=1e-10)
    np.testing.assert_allclose(back.frequency, F, rtol=1e-12)


def test_port_numbers_survive(rng, tmp_path):
    s = random_s(3, rng, ports=[2, 3, 7])
    write_touchstone(s, tmp_path / "x.s3p")
    back = deembed.read_touchstone(tmp_path / "x.s3p")
    assert ports_of(back) == (2, 3, 7)
    assert ports_of(deembed.read_touchstone(tmp_path / "x.s3p", ports=[1, 2, 3])) == (1, 2, 3)


def test_each_port_keeps_its_own_impedance_in_version_2(rng, tmp_path):
    s = random_s(3, rng, z0=[50.0, 75.0, 25.0])
    write_touchstone(s, tmp_path / "x.s3p", version="2.0")
    back = deembed.read_touchstone(tmp_path / "x.s3p")
    np.testing.assert_array_equal(back.z0, [50.0, 75.0, 25.0])
    with pytest.raises(
        FileError, match="the ports are in 50, 75 and 25 ohm, and version 1.1 holds one value"
    ):
        write_touchstone(s, tmp_path / "y.s3p")
    assert not (tmp_path / "y.s3p").exists()


def test_complex_impedances_and_leading_dims_are_not_written(rng, tmp_path):
    with pytest.raises(
        FileError, match="the reference impedance is complex .* Renormalize to a real impedance"
    ):
        write_touchstone(random_s(2, rng, z0=50 + 3j), tmp_path / "x.s2p", version="2.0")
    draws = sparams(np.zeros((4, 5, 2, 2)), F)
    with pytest.raises(FileError, match="dims are .'draw', 'frequency', .* one entry of the leading dims"):
        write_touchstone(draws, tmp_path / "x.s2p")
    with pytest.raises(FileError, match=r"version '3\.0' cannot be written\. Use 1\.1 or 2\.0"):
        write_touchstone(random_s(2, rng), tmp_path / "x.s2p", version="3.0")
    assert list(tmp_path.iterdir()) == []


TWO_PORT = "1 11 0 21 0 12 0 22 0\n2 11 1 21 1 12 1 22 1\n"


def test_version_1_two_ports_go_column_by_column():
    s = parse_touchstone("# GHz S RI R 50\n" + TWO_PORT, name="x.s2p")
    np.testing.assert_array_equal(s.values[0].real, [[11, 12], [21, 22]])


@pytest.mark.parametrize(
    ("order", "wanted"), [("21_12", [[11, 12], [21, 22]]), ("12_21", [[11, 21], [12, 22]])]
)
def test_version_2_two_ports_go_as_stated(order, wanted):
    text = (
        f"[Version] 2.0\n# GHz S RI R 50\n[Number of Ports] 2\n[Two-Port Data Order] {order}\n"
        f"[Number of Frequencies] 2\n[Reference] 50 25.0\n[Network Data]\n{TWO_PORT}[End]\n"
    )
    s = parse_touchstone(text, name="x.s2p")
    np.testing.assert_array_equal(s.values[0].real, wanted)
    np.testing.assert_array_equal(s.z0, [50, 25])


@pytest.mark.parametrize("triangle", ["Lower", "Upper"])
def test_triangles_are_mirrored(triangle):
    rows = (
        "1 11 0\n21 0 22 0\n31 0 32 0 33 0\n"
        if triangle == "Lower"
        else "1 11 0 12 0 13 0\n22 0 23 0\n33 0\n"
    )
    text = (
        f"[Version] 2.1\n# Hz S RI\n[Number of Ports] 3\n[Number of Frequencies] 1\n[Reference]\n50 50\n50\n"
        f"[Matrix Format] {triangle}\n[Network Data]\n{rows}[End]\n"
    )
    values = parse_touchstone(text, name="x.ts").values[0].real
    np.testing.assert_array_equal(values, values.T)
    names = np.array([[11, 12, 13], [12, 22, 23], [13, 23, 33]])
    np.testing.assert_array_equal(
        values, names if triangle == "Upper" else [[11, 21, 31], [21, 22, 32], [31, 32, 33]]
    )


def test_a_noise_block_is_left_out():
    text = "# GHz S RI R 50\n" + TWO_PORT + "! noise\n0.5 1.2 0.3 40 0.2\n1.5 1.4 0.2 60 0.3\n"
    s = parse_touchstone(text, name="x.s2p")
    np.testing.assert_array_equal(s.frequency, [1e9, 2e9])
    text = (
        "[Version] 2.0\n# GHz S RI R 50\n[Number of Ports] 2\n[Two-Port Data Order] 21_12\n"
        f"[Number of Frequencies] 2\n[Number of Noise Frequencies] 1\n[Network Data]\n{TWO_PORT}"
        "[Noise Data]\n0.5 1.2 0.3 40 0.2\n[End]\n"
    )
    assert parse_touchstone(text, name="x.s2p").sizes["frequency"] == 2


def test_an_information_block_and_inline_comments_are_not_data():
    text = (
        "[Version] 2.0 ! first\n# GHz S RI R 50\n[Number of Ports] 1\n[Number of Frequencies] 1\n"
        "[Begin Information]\n[Anything] goes here 1 2 3\n[End Information]\n[Network Data]\n1 0.5 0 ! here\n[End]\n"
    )
    s = parse_touchstone(text, name="x.s1p")
    assert s.values.item() == 0.5 and s.attrs["comments"] == "first\nhere"


@pytest.mark.parametrize(("parameter", "scale"), [("Z", (75, 75, 75, 75)), ("Y", (1 / 75,) * 4)])
def test_impedance_and_admittance_files(parameter, scale, rng):
    """Version 1.1 divides Z by R and multiplies Y by R (Touchstone 1.1, section on normalization)."""
    s = random_s(2, rng, z0=75.0)
    matrix = (deembed.impedance(s) if parameter == "Z" else deembed.admittance(s)).values / scale[0]
    rows = [
        " ".join(repr(float(v)) for v in (f, *np.ravel([[z.real, z.imag] for z in m.T.ravel()])))
        for f, m in zip(F, matrix, strict=True)
    ]
    text = f"# Hz {parameter} RI R 75\n" + "\n".join(rows)
    np.testing.assert_allclose(parse_touchstone(text, name="x.s2p").values, s.values, atol=1e-12)
    unscaled = [
        " ".join(repr(float(v)) for v in (f, *np.ravel([[z.real, z.imag] for z in (m * scale[0]).T.ravel()])))
        for f, m in zip(F, matrix, strict=True)
    ]
    text = (
        f"[Version] 2.0\n# Hz {parameter} RI R 75\n[Number of Ports] 2\n[Two-Port Data Order] 21_12\n"
        "[Number of Frequencies] 5\n[Network Data]\n" + "\n".join(unscaled) + "\n[End]\n"
    )
    np.testing.assert_allclose(parse_touchstone(text, name="x.s2p").values, s.values, atol=1e-12)


@pytest.mark.parametrize("parameter", ["H", "G"])
def test_hybrid_files(parameter, rng):
    """h11 = det Z / z22, h12 = z12 / z22, h21 = -z21 / z22, h22 = 1 / z22 (any circuit textbook); G = H^-1."""
    s = random_s(2, rng)
    z = deembed.impedance(s).values
    det = np.linalg.det(z)
    h = np.array([[det, z[:, 0, 1]], [-z[:, 1, 0], np.ones(5)]]) / z[:, 1, 1]
    h = np.moveaxis(h, -1, 0)
    m = h if parameter == "H" else np.linalg.inv(h)
    m = m * (np.array([[1 / 50, 1], [1, 50]]) if parameter == "H" else np.array([[50, 1], [1, 1 / 50]]))
    rows = [
        " ".join(repr(float(v)) for v in (f, *np.ravel([[q.real, q.imag] for q in k.T.ravel()])))
        for f, k in zip(F, m, strict=True)
    ]
    text = f"# Hz {parameter} RI R 50\n" + "\n".join(rows)
    np.testing.assert_allclose(parse_touchstone(text, name="x.s2p").values, s.values, atol=1e-11)


@given(hz=st.integers(1, 10**11))
def test_one_frequency_is_one_number_whatever_the_unit(hz):
    read = [
        parse_touchstone(
            f"# {unit} S RI R 50\n{hz / 10**power:.{power}f} 0 0\n", name="x.s1p"
        ).frequency.item()
        for unit, power in (("Hz", 0), ("MHz", 6), ("GHz", 9))
    ]
    # hz / 10**power is exact to the last written digit for the integers drawn here.
    assert read[0] == float(hz) and abs(read[1] - hz) < 1e-4 * hz and abs(read[2] - hz) < 1e-4 * hz


def test_gigahertz_and_hertz_agree_to_the_bit():
    in_hz = "# Hz S RI R 50\n" + "".join(f"{k * 10_000_000} 0 0\n" for k in range(1, 400))
    in_ghz = "# GHz S RI R 50\n" + "".join(f"{k / 100:.2f} 0 0\n" for k in range(1, 400))
    np.testing.assert_array_equal(*(parse_touchstone(t, name="x.s1p").frequency for t in (in_hz, in_ghz)))


def test_across_the_border_and_back(rng):
    s = random_s(3, rng, z0=[40 + 5j, 50.0, 60 - 7j])
    network = deembed.to_skrf(s)
    network.s[0, 0, 0] = 99  # a copy: the labelled array must not notice
    back = deembed.from_skrf(deembed.to_skrf(s))
    np.testing.assert_allclose(back.values, s.values, atol=1e-15)
    np.testing.assert_array_equal(back.z0, s.z0)
    with pytest.raises(FileError, match="Select one entry of the leading dims"):
        deembed.to_skrf(s.expand_dims("draw"))


def test_power_waves_become_pseudo_waves_at_the_border(rng):
    z0 = np.array([40 + 25j, 60 - 7j])
    s = random_s(2, rng, z0=z0)
    power = skrf.Network(f=F, f_unit="Hz", z=deembed.impedance(s).values, z0=z0, s_def="power")
    np.testing.assert_allclose(deembed.from_skrf(power).values, s.values, atol=1e-10)


def test_real_readings_are_read_as_scikit_rf_reads_them(measured):
    for path in sorted(measured.glob("*/*.s?p")):
        s, network = deembed.read_touchstone(path), skrf.Network(str(path))
        np.testing.assert_allclose(s.values, network.s, atol=1e-15)
        np.testing.assert_allclose(s.frequency, network.f, rtol=1e-15)


def test_no_path_of_the_machine_is_written(rng, tmp_path):
    write_touchstone(random_s(2, rng), tmp_path / "x.s2p", provenance=["from round 1-2"])
    assert str(tmp_path) not in (tmp_path / "x.s2p").read_text()
    assert touchstone_text(random_s(1, rng)).startswith("# Hz S RI R 50.0")
