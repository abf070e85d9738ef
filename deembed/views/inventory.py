"""Every picture of an outcome by name, made when asked for."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from functools import partial
from typing import Any

from deembed.findings import Finding
from deembed.views import network, part, readings, terms
from deembed.views.job_facts import facts_of
from deembed.views.model import Band, Picture, bands_of
from deembed.views.places import place_ports, places

__all__ = ["Inventory", "pictures"]


class Inventory(Mapping[str, Picture]):
    """Names to pictures; each picture is made on first use and kept.

    Parameters
    ----------
    makers : mapping of str to callable
    """

    def __init__(self, makers: Mapping[str, Callable[[], Picture]]) -> None:
        self._makers = dict(makers)
        self._made: dict[str, Picture] = {}

    def __getitem__(self, name: str) -> Picture:
        if name not in self._made:
            if name not in self._makers:
                raise KeyError(f"no picture {name!r}; there are {', '.join(self._makers)}")
            self._made[name] = self._makers[name]()
        return self._made[name]

    def __iter__(self) -> Iterator[str]:
        return iter(self._makers)

    def __len__(self) -> int:
        return len(self._makers)

    def __contains__(self, name: object) -> bool:
        return name in self._makers

    def group(self, prefix: str) -> tuple[str, ...]:
        """Names that start with ``prefix.``, e.g. ``part``."""
        return tuple(n for n in self._makers if n.split(".")[0] == prefix)


def _about_part(findings: Sequence[Finding]) -> list[Finding]:
    kept = []
    for f in findings:
        named = [place_ports(p)[0] for p in places(f.where)]
        if not named or all(n in ("part", "part port") for n in named):
            kept.append(f)
    return kept


def _of_kind(findings: Sequence[Finding], *roots: str) -> tuple[Band, ...]:
    return bands_of(f for f in findings if any(root in f.kind for root in roots))


def pictures(outcome: Any) -> Inventory:
    """The pictures of an outcome.

    Parameters
    ----------
    outcome : Outcome
        See `deembed.job`.

    Returns
    -------
    Inventory
        ``part.*``, ``cable-plane.<part port>``, ``rounds.disagreement``, ``round.<label>``,
        ``terms.port-<analyzer port>``, ``terms.redundancy``, ``terms.line-phase``, ``arm.<part port>``,
        ``arm.<part port>.delay``, ``fixture.coupling``, ``raw.<file>``; what does not apply is not there.
    """
    return Inventory(
        {**_part(outcome), **_rounds(outcome), **_terms(outcome), **_arms(outcome), **_raw(outcome)}
    )


def _part(outcome: Any) -> dict[str, Callable[[], Picture]]:
    s, metrics, findings = outcome.part, outcome.metrics, tuple(outcome.findings)
    bands = bands_of(_about_part(findings))
    makers: dict[str, Callable[[], Picture]] = {}
    many = s.sizes["port_out"] > 1
    if many:
        makers["part.transmission"] = partial(network.transmission, s, bands=bands)
    makers["part.reflection"] = partial(network.reflection, s, bands=bands)
    makers["part.phase"] = partial(network.phase, s, bands=bands)
    makers["part.delay"] = partial(network.delay, s, bands=bands)
    makers["part.chart"] = partial(network.chart, s)
    makers["part.gain"] = partial(part.gain_ceiling, metrics, bands=_of_kind(findings, "gain", "passiv"))
    if many:
        makers["part.reciprocity"] = partial(part.reciprocity, metrics, bands=_of_kind(findings, "reciproc"))
    makers["part.power"] = partial(part.power_balance, metrics, bands=_of_kind(findings, "power"))
    if "three_way_floor" in metrics and s.sizes["port_out"] == 3:
        makers["part.three-way"] = partial(part.three_way, metrics, bands=_of_kind(findings, "three"))
    if "lossless_error" in metrics:
        makers["part.lossless"] = partial(part.lossless_error, metrics, bands=_of_kind(findings, "lossless"))
    return makers


def _rounds(outcome: Any) -> dict[str, Callable[[], Picture]]:
    makers: dict[str, Callable[[], Picture]] = {}
    rounds = tuple(outcome.rounds)
    labels = [str(r.name) for r in rounds]
    for port in (int(p) for p in outcome.part.port_out.values):
        if any(port in r.port_out.values for r in rounds):
            makers[f"cable-plane.{port}"] = partial(
                readings.reflection_readings, rounds, port=port, labels=labels
            )
    if outcome.disagreement is not None:
        bands = _of_kind(tuple(outcome.findings), "disagree")
        makers["rounds.disagreement"] = partial(readings.disagreement, outcome.disagreement, bands=bands)
    for one, label in zip(rounds, labels, strict=True):
        makers[f"round.{label}"] = partial(readings.round_picture, one, label=label)
    return makers


def _terms(outcome: Any) -> dict[str, Callable[[], Picture]]:
    found = outcome.terms
    if found is None:
        return {}
    makers: dict[str, Callable[[], Picture]] = {
        f"terms.port-{int(p)}": partial(terms.port_terms, found, port=int(p)) for p in found.port_in.values
    }
    if "redundancy" in found:
        bands = _of_kind(tuple(outcome.findings), "redundan")
        makers["terms.redundancy"] = partial(terms.redundancy, found, bands=bands)
    if "line_phase" in found:
        makers["terms.line-phase"] = partial(terms.line_phase, found)
    return makers


def _arms(outcome: Any) -> dict[str, Callable[[], Picture]]:
    shell = outcome.shell
    if shell is None:
        return {}
    makers: dict[str, Callable[[], Picture]] = {}
    given = {a.part_port for a in facts_of(outcome.job).arms}
    coupled = bool(facts_of(outcome.job).coupled)
    for port in (int(p) for p in shell.port_out.values):
        if coupled or port in given:
            makers[f"arm.{port}"] = partial(readings.arm, shell, port=port)
            makers[f"arm.{port}.delay"] = partial(readings.arm_delay, shell, port=port)
    if coupled:
        makers["fixture.coupling"] = partial(readings.coupling, shell)
    return makers


def _raw(outcome: Any) -> dict[str, Callable[[], Picture]]:
    return {f"raw.{path}": partial(readings.raw, one, path=path) for path, one in outcome.raw.items()}
