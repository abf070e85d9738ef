"""Pictures of error terms equal the terms."""

import numpy as np
import pytest

from deembed.errors import DeembedError
from deembed.views import terms as view


def test_every_term_of_a_port_is_there_in_decibels(outcome):
    p = view.port_terms(outcome.terms, port=2)
    by_name = {t.name: t.y for t in p.traces}
    assert set(by_name) == {
        "directivity",
        "source match",
        "reflection tracking",
        "load match",
        "transmission tracking",
    }
    own, between = outcome.terms.sel(port_in=2), outcome.terms.sel(port_out=2, port_in=1)
    assert np.allclose(by_name["directivity"], 20 * np.log10(np.abs(own.directivity)), atol=1e-12)
    assert np.allclose(by_name["load match"], 20 * np.log10(np.abs(between.load_match)), atol=1e-12)
    assert "directivity at most -28 dB" in p.alt


def test_no_isolation_is_not_reported_as_missing(outcome):
    assert view.port_terms(outcome.terms, port=1).missing == ()
    leaky = outcome.terms.assign(isolation=outcome.terms.isolation + 1e-4)
    found = {t.name: t.y for t in view.port_terms(leaky, port=1).traces}
    assert np.allclose(found["isolation"], -80.0)


def test_with_more_than_two_ports_terms_say_who_drives(outcome):
    three = outcome.terms.reindex(port_in=[1, 2, 3], port_out=[1, 2, 3], fill_value=0.5)
    names = [t.name for t in view.port_terms(three, port=1).traces]
    assert "load match from 2" in names
    assert "load match from 3" in names


def test_redundancy_is_the_magnitude_of_the_residual(outcome):
    p = view.redundancy(outcome.terms)
    f = outcome.terms.frequency.values
    assert np.allclose(p.traces[0].y, 1e-3 * (1 + f / f[-1]), rtol=1e-9)
    assert p.traces[0].name == "ports 1-2"
    assert "at most 0.002 (ports 1-2 at 6 GHz)" in p.alt
    assert view.redundancy_words(outcome.terms) == ""


def test_absent_redundancy_gives_the_reason(outcome):
    bare = outcome.terms.drop_vars("redundancy").assign_attrs(redundancy_absent="boxes make it an identity")
    p = view.redundancy(bare)
    assert p.traces == ()
    assert "boxes make it an identity" in p.alt
    assert view.redundancy_words(bare.drop_attrs()) == "the terms carry no redundancy residual"


def test_line_phase_shows_the_trusted_band(outcome):
    phased = outcome.terms.assign(line_phase=("frequency", -np.linspace(5, 200, 401)))
    p = view.line_phase(phased)
    assert [m.value for m in p.limits] == [20.0, 160.0]
    assert p.traces[0].y[-1] == 200
    assert "5 to 200 degrees" in p.alt


def test_leading_dimensions_are_refused(outcome):
    with pytest.raises(DeembedError, match="the error terms also runs along draw"):
        view.port_terms(outcome.terms.expand_dims(draw=2), port=1)
