"""Checks of rounds against part and analyzer: ports, repeats, and whether everything is read."""

from __future__ import annotations

from collections.abc import Iterable
from itertools import combinations, permutations

from deembed import words
from deembed.job.places import Place
from deembed.job.schema import JobFile

__all__ = ["coverage", "known_ports", "ports_in_words", "rounds"]


def _pair(ports: Iterable[int]) -> str:
    """Ports in the words of findings: ``1-2``."""
    return "-".join(str(p) for p in ports)


def ports_in_words(count: int) -> str:
    return "1 port" if count == 1 else f"{count} ports"


def known_ports(ports: tuple[int, ...], most: int, path: tuple[str | int, ...], place: Place) -> None:
    if max(ports) > most:
        raise place.error(
            path,
            f"{list(ports)} names analyzer port {max(ports)}, but the analyzer has {ports_in_words(most)}",
            "Correct it, or analyzer.ports.",
        )
    _once(ports, path, place)


def _once(ports: tuple[int, ...], path: tuple[str | int, ...], place: Place) -> None:
    if len(set(ports)) != len(ports):
        raise place.error(path, f"{list(ports)} names a port twice", "Name each port once.")


def rounds(spec: JobFile, place: Place) -> None:
    for i, one in enumerate(spec.rounds):
        path = ("rounds", i)
        _once(one.part_ports, (*path, "part_ports"), place)
        if max(one.part_ports) > spec.job.part_ports:
            raise place.error(
                (*path, "part_ports"),
                f"{list(one.part_ports)} names part port {max(one.part_ports)}, "
                f"but the part has {ports_in_words(spec.job.part_ports)}",
                "Correct it, or job.part_ports.",
            )
        if one.analyzer_ports is None:
            if spec.calibration.method != "none":
                raise place.error(
                    (*path, "analyzer_ports"), "this key is missing", "Add it, for example [1, 2]."
                )
        else:
            known_ports(one.analyzer_ports, spec.analyzer.ports, (*path, "analyzer_ports"), place)
            if len(one.analyzer_ports) != len(one.part_ports):
                raise place.error(
                    (*path, "part_ports"),
                    f"{list(one.part_ports)} came for analyzer_ports {list(one.analyzer_ports)}",
                    "Name one part port per analyzer port, in the same order.",
                )
        if len(one.part_ports) == 1 < spec.job.part_ports:
            raise place.error(
                (*path, "part_ports"),
                f"{list(one.part_ports)} reads one port alone of a part with {ports_in_words(spec.job.part_ports)}",
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
                f"two rounds for the same part ports {_pair(one.part_ports)}: "
                f"{first.file} (rounds[{seen[key]}]) and {one.file}",
                "Keep one of them, or correct part_ports.",
            )
        seen[key] = i


def coverage(spec: JobFile, place: Place) -> None:
    ports = range(1, spec.job.part_ports + 1)
    read = {p for one in spec.rounds for p in one.part_ports}
    never = [p for p in ports if p not in read]
    if never:
        raise place.error(
            ("rounds",),
            f"part {'port' if len(never) == 1 else 'ports'} {words.listed(never)} "
            f"{'is' if len(never) == 1 else 'are'} never read; "
            f"the rounds are {words.listed(_pair(one.part_ports) for one in spec.rounds)}",
            "Add rounds that read every pair of part ports.",
        )
    if spec.analyzer.drive == "first-port-only":
        _both_directions(spec, place)
    done = {frozenset(two) for one in spec.rounds for two in combinations(one.part_ports, 2)}
    missing = [two for two in combinations(ports, 2) if frozenset(two) not in done]
    if missing:
        raise place.error(
            ("rounds",),
            f"no round reads part ports {words.listed(_pair(two) for two in missing)}",
            f"Add a round with part_ports = {list(missing[0])}.",
        )


def _both_directions(spec: JobFile, place: Place) -> None:
    done = {one.seats(): i for i, one in enumerate(spec.rounds)}
    for ports, i in done.items():
        turned = [other for other in permutations(ports) if other != ports and other in done]
        if len(ports) == 2 and not turned:
            raise place.error(
                ("rounds", i, "part_ports"),
                f"only the first port drives, and the sweep of the turned part to round {_pair(ports)} "
                "is missing",
                f"Add a round with part_ports = {list(ports[::-1])}.",
            )
        if turned and spec.rounds[done[turned[0]]].terminations != spec.rounds[i].terminations:
            raise place.error(
                ("rounds", i, "terminations"),
                f"rounds {_pair(ports)} and {_pair(turned[0])} are the two directions of one round "
                "and name different terminations",
                "Give both the same.",
            )
