"""Checks of a job file that need more than one key: rounds, ports, pairs, standards, arms, terminations."""

from __future__ import annotations

from collections.abc import Iterable
from itertools import combinations, permutations

from deembed import words
from deembed.job.methods import METHODS, method_named
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
    _rounds(spec, place)
    _coverage(spec, place)
    _terminations(spec, place)
    _fixture(spec, place)


def pair(ports: Iterable[int]) -> str:
    """Ports in the words of findings: ``1-2``."""
    return "-".join(str(p) for p in ports)


def _analyzer(spec: JobFile, place: Place) -> None:
    analyzer = spec.analyzer
    for port in analyzer.switch_terms:
        if port > analyzer.ports:
            raise place.error(
                ("analyzer", "switch_terms", str(port)),
                f"switch terms for port {port}, but the analyzer has {_ports(analyzer.ports)}",
                "Correct the port or analyzer.ports.",
            )
    if analyzer.drive == "first-port-only" and analyzer.ports != 2:
        raise place.error(
            ("analyzer", "drive"),
            f'"first-port-only" came with an analyzer of {_ports(analyzer.ports)}; it is for two',
            "Set analyzer.ports = 2.",
        )


def _ports(count: int) -> str:
    return "1 port" if count == 1 else f"{count} ports"


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
    for i, reading in enumerate(calibration.readings):
        _known_ports(reading.ports, analyzer.ports, ("calibration", "readings", i, "ports"), place)
    if method.check is not None:
        method.check(spec, place)


def _known_ports(ports: tuple[int, ...], most: int, path: tuple[str | int, ...], place: Place) -> None:
    if max(ports) > most:
        raise place.error(
            path,
            f"{list(ports)} names analyzer port {max(ports)}, but the analyzer has {_ports(most)}",
            "Correct it, or analyzer.ports.",
        )
    _once(ports, path, place)


def _once(ports: tuple[int, ...], path: tuple[str | int, ...], place: Place) -> None:
    if len(set(ports)) != len(ports):
        raise place.error(path, f"{list(ports)} names a port twice", "Name each port once.")


def _rounds(spec: JobFile, place: Place) -> None:
    for i, one in enumerate(spec.rounds):
        path = ("rounds", i)
        _once(one.part_ports, (*path, "part_ports"), place)
        if max(one.part_ports) > spec.job.part_ports:
            raise place.error(
                (*path, "part_ports"),
                f"{list(one.part_ports)} names part port {max(one.part_ports)}, "
                f"but the part has {_ports(spec.job.part_ports)}",
                "Correct it, or job.part_ports.",
            )
        if one.analyzer_ports is None:
            if spec.calibration.method != "none":
                raise place.error(
                    (*path, "analyzer_ports"), "this key is missing", "Add it, for example [1, 2]."
                )
        else:
            _known_ports(one.analyzer_ports, spec.analyzer.ports, (*path, "analyzer_ports"), place)
            if len(one.analyzer_ports) != len(one.part_ports):
                raise place.error(
                    (*path, "part_ports"),
                    f"{list(one.part_ports)} came for analyzer_ports {list(one.analyzer_ports)}",
                    "Name one part port per analyzer port, in the same order.",
                )
        if len(one.part_ports) == 1 < spec.job.part_ports:
            raise place.error(
                (*path, "part_ports"),
                f"{list(one.part_ports)} reads one port alone of a part with {_ports(spec.job.part_ports)}",
                "Read at least two ports at a time.",
            )
    _repeats(spec, place)


def _repeats(spec: JobFile, place: Place) -> None:
    seen: dict[tuple[int, ...], int] = {}
    ordered = spec.analyzer.drive == "first-port-only"
    for i, one in enumerate(spec.rounds):
        key = one.seats() if ordered else tuple(sorted(one.part_ports))
        if key in seen:
            first = spec.rounds[seen[key]]
            raise place.error(
                ("rounds", i, "part_ports"),
                f"two rounds for the same part ports {pair(one.part_ports)}: "
                f"{first.file} (rounds[{seen[key]}]) and {one.file}",
                "Keep one of them, or correct part_ports.",
            )
        seen[key] = i


def _coverage(spec: JobFile, place: Place) -> None:
    ports = range(1, spec.job.part_ports + 1)
    read = {p for one in spec.rounds for p in one.part_ports}
    never = [p for p in ports if p not in read]
    if never:
        raise place.error(
            ("rounds",),
            f"part {'port' if len(never) == 1 else 'ports'} {words.listed(never)} "
            f"{'is' if len(never) == 1 else 'are'} never read; "
            f"the rounds are {words.listed(pair(one.part_ports) for one in spec.rounds)}",
            "Add rounds that read every pair of part ports.",
        )
    if spec.analyzer.drive == "first-port-only":
        _both_directions(spec, place)
    done = {frozenset(two) for one in spec.rounds for two in combinations(one.part_ports, 2)}
    missing = [two for two in combinations(ports, 2) if frozenset(two) not in done]
    if missing:
        raise place.error(
            ("rounds",),
            f"no round reads part ports {words.listed(pair(two) for two in missing)}",
            f"Add a round with part_ports = {list(missing[0])}.",
        )


def _both_directions(spec: JobFile, place: Place) -> None:
    done = {one.seats(): i for i, one in enumerate(spec.rounds)}
    for ports, i in done.items():
        turned = [other for other in permutations(ports) if other != ports and other in done]
        if len(ports) == 2 and not turned:
            raise place.error(
                ("rounds", i, "part_ports"),
                f"only the first port drives, and the sweep of the turned part to round {pair(ports)} "
                "is missing",
                f"Add a round with part_ports = {list(ports[::-1])}.",
            )
        if turned and spec.rounds[done[turned[0]]].terminations != spec.rounds[i].terminations:
            raise place.error(
                ("rounds", i, "terminations"),
                f"rounds {pair(ports)} and {pair(turned[0])} are the two directions of one round "
                "and name different terminations",
                "Give both the same.",
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
            f"a termination for part port {port}, but the part has {_ports(spec.job.part_ports)}",
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
                f"an arm for part port {arm.part_port}, but the part has {_ports(count)}",
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
                f"{list(ports)} came for a part with {_ports(count)}",
                "Name one port of the file per part port, in the order of the part ports.",
            )
    if sorted(both) != list(range(1, 2 * count + 1)):
        raise place.error(
            ("fixture", "coupled", "part_side_ports"),
            f"analyzer side {list(coupled.analyzer_side_ports)} and part side "
            f"{list(coupled.part_side_ports)} do not name each of the ports 1 to {2 * count} once",
            "Correct the port map.",
        )
