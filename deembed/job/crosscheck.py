"""Checks of a job file that need more than one key: rounds, ports, pairs, standards, arms, terminations."""

from __future__ import annotations

from deembed import words
from deembed.job.crosscheck_rounds import coverage, known_ports, ports_in_words, rounds
from deembed.job.methods import ISOLATION, METHODS, Method, method_named
from deembed.job.places import Place
from deembed.job.schema import JobFile

__all__ = ["crosscheck"]


def crosscheck(spec: JobFile, place: Place) -> None:
    """Raise the first contradiction between keys.

    Parameters
    ----------
    spec : JobFile
    place : Place
        Makes errors that name file, line and key.

    Raises
    ------
    JobError
    """
    _analyzer(spec, place)
    _calibration(spec, place)
    rounds(spec, place)
    coverage(spec, place)
    _terminations(spec, place)
    _fixture(spec, place)
    _checks(spec, place)


def _checks(spec: JobFile, place: Place) -> None:
    for i, one in enumerate(spec.checks):
        known_ports(one.analyzer_ports, spec.analyzer.ports, ("checks", i, "analyzer_ports"), place)
        if spec.analyzer.drive == "first-port-only" and one.analyzer_ports != (1,):
            raise place.error(
                ("checks", i, "analyzer_ports"),
                f"ports {list(one.analyzer_ports)} cannot be checked where only port 1 drives",
                "Check with a one-port part on port 1.",
            )
        if one.uncertainty == one.reference_uncertainty == 0:
            raise place.error(
                ("checks", i, "uncertainty"),
                "both uncertainties are zero",
                "State a standard uncertainty, as wave amplitude, of the reading or of the known values.",
            )


def _analyzer(spec: JobFile, place: Place) -> None:
    analyzer = spec.analyzer
    for port in analyzer.switch_terms:
        if port > analyzer.ports:
            raise place.error(
                ("analyzer", "switch_terms", str(port)),
                f"switch terms for port {port}, but the analyzer has {ports_in_words(analyzer.ports)}",
                "Correct the port or analyzer.ports.",
            )
    if analyzer.drive == "first-port-only" and analyzer.ports != 2:
        raise place.error(
            ("analyzer", "drive"),
            f'"first-port-only" came with an analyzer of {ports_in_words(analyzer.ports)}; it is for two',
            "Set analyzer.ports = 2.",
        )


def _calibration(spec: JobFile, place: Place) -> None:
    calibration, analyzer = spec.calibration, spec.analyzer
    if calibration.method not in METHODS:
        close = words.nearest(calibration.method, METHODS)
        raise place.error(
            ("calibration", "method"),
            f"unknown method {calibration.method!r}",
            f"{f'Did you mean {close}? ' if close else ''}Known: {', '.join(METHODS)}.",
        )
    method = method_named(calibration.method)
    if analyzer.drive not in method.drives:
        raise place.error(
            ("analyzer", "drive"),
            f"method {calibration.method!r} cannot be used with drive {analyzer.drive!r}",
            f"It needs {words.listed(method.drives, last='or')}.",
        )
    if method.kit and calibration.kit is None:
        raise place.error(
            ("calibration",),
            f"method {calibration.method!r} needs a kit and none is named",
            'Add kit = "a name in standards_defs" or the path of a kit file.',
        )
    if method.kit and not calibration.readings:
        raise place.error(
            ("calibration",),
            f"method {calibration.method!r} needs readings of standards and there are none",
            "Add one [[calibration.readings]] table per standard.",
        )
    if not method.kit and calibration.readings:
        raise place.error(
            ("calibration", "readings", 0),
            f"readings of standards came with method {calibration.method!r}, which uses none",
            "Remove them, or name the method that they belong to.",
        )
    _unused(spec, method, place)
    for i, reading in enumerate(calibration.readings):
        known_ports(reading.ports, analyzer.ports, ("calibration", "readings", i, "ports"), place)
    if method.check is not None:
        method.check(spec, place)


def _unused(spec: JobFile, method: Method, place: Place) -> None:
    """What is given and would not be used is a misunderstanding, not a detail."""
    calibration = spec.calibration
    if not method.kit and calibration.kit is not None:
        raise place.error(
            ("calibration", "kit"),
            f"a kit came with method {calibration.method!r}, which uses none",
            "Remove it, or name the method that it belongs to.",
        )
    if calibration.isolation and not method.uses_isolation:
        raise place.error(
            ("calibration", "isolation"),
            f"method {calibration.method!r} takes no leakage out",
            "Set isolation = false, or use solt.",
        )
    for i, reading in enumerate(calibration.readings):
        if reading.standard == ISOLATION and not calibration.isolation:
            raise place.error(
                ("calibration", "readings", i, "standard"),
                "an isolation reading came and calibration.isolation is false",
                "Set isolation = true, or remove the reading.",
            )


def _terminations(spec: JobFile, place: Place) -> None:
    for port in spec.terminations:
        _termination(port, spec, ("terminations", str(port)), place)
    for i, one in enumerate(spec.rounds):
        for port in one.terminations:
            path = ("rounds", i, "terminations", str(port))
            _termination(port, spec, path, place)
            if port in one.part_ports:
                raise place.error(
                    path,
                    f"a termination at part port {port}, which this round reads",
                    "Only ports that the round leaves free are terminated.",
                )


def _termination(port: int, spec: JobFile, path: tuple[str | int, ...], place: Place) -> None:
    if port > spec.job.part_ports:
        raise place.error(
            path,
            f"a termination for part port {port}, but the part has {ports_in_words(spec.job.part_ports)}",
            "Correct the port or job.part_ports.",
        )


def _fixture(spec: JobFile, place: Place) -> None:
    fixture, count = spec.fixture, spec.job.part_ports
    if fixture.arms and fixture.coupled is not None:
        raise place.error(
            ("fixture", "coupled"),
            "both fixture.arms and fixture.coupled are given",
            "A fixture is either one arm per port or one coupled network: keep one of them.",
        )
    seen: dict[int, int] = {}
    for i, arm in enumerate(fixture.arms):
        path = ("fixture", "arms", i, "part_port")
        if arm.part_port > count:
            raise place.error(
                path,
                f"an arm for part port {arm.part_port}, but the part has {ports_in_words(count)}",
                "Correct the port or job.part_ports.",
            )
        if arm.part_port in seen:
            first = fixture.arms[seen[arm.part_port]]
            raise place.error(
                path,
                f"two arms for part port {arm.part_port}: {first.file} and {arm.file}",
                "Keep one of them.",
            )
        seen[arm.part_port] = i
    if fixture.coupled is not None:
        _coupled(spec, place)


def _coupled(spec: JobFile, place: Place) -> None:
    coupled, count = spec.fixture.coupled, spec.job.part_ports
    assert coupled is not None
    both = (*coupled.analyzer_side_ports, *coupled.part_side_ports)
    for key in ("analyzer_side_ports", "part_side_ports"):
        ports = getattr(coupled, key)
        if len(ports) != count:
            raise place.error(
                ("fixture", "coupled", key),
                f"{list(ports)} came for a part with {ports_in_words(count)}",
                "Name one port of the file per part port, in the order of the part ports.",
            )
    if sorted(both) != list(range(1, 2 * count + 1)):
        raise place.error(
            ("fixture", "coupled", "part_side_ports"),
            f"analyzer side {list(coupled.analyzer_side_ports)} and part side "
            f"{list(coupled.part_side_ports)} do not name each of the ports 1 to {2 * count} once",
            "Correct the port map.",
        )
