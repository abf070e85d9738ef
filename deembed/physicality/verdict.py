"""The verdict: one plain sentence, whether the part can be believed, and what could not have been seen."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence

from deembed import words
from deembed.banding import at_band
from deembed.findings import BlindSpot, Finding, sort_findings

__all__ = ["verdict"]

_NOT_AS = {
    "gain": "passive",
    "power-balance": "passive",
    "non-reciprocity": "reciprocal",
    "lossless": "lossless",
    "three-way": "reciprocal",
}
# Said when the job's blind spots were not worked out: true of any job.
_ALWAYS_UNSEEN = (
    "a mistake that leaves a passive part behind, such as a wrong length, looks just like a good part"
)


def verdict(
    findings: Iterable[Finding],
    *,
    expect: Mapping[str, bool] | None,
    blind_spots: Sequence[BlindSpot] = (),
) -> str:
    """One sentence on whether to believe the part.

    Parameters
    ----------
    findings : iterable of Finding
        Of the whole job: calibration, rounds, fixture and part.
    expect : mapping or None
        What was expected, as in `assess`.
    blind_spots : sequence of BlindSpot
        Mistakes that would have left no trace.

    Returns
    -------
    str
        Contradictions first; then each place with a warning; without a contradiction also what these
        readings could not have shown.

    Examples
    --------
    >>> verdict([], expect={"passive": True})
    'Physical as far as these readings can show: passive within the tolerance; what they could not \
have shown: a mistake that leaves a passive part behind, such as a wrong length, looks just like a good part.'
    """
    findings = sort_findings(findings)
    against = [f for f in findings if f.severity == "contradiction"]
    warnings = [f for f in findings if f.severity == "warning"]
    if against:
        sentence = _not_believable(against)
        doubts = f"; also look at {_places(warnings)}" if warnings else ""
        return f"{sentence}{doubts}."
    unseen = _unseen(blind_spots)
    doubts = f"; but look at {_places(warnings)}" if warnings else ""
    true = [name for name, value in (expect or {}).items() if value]
    if any(f.kind == "not-judged" for f in warnings):
        return f"Not judged, since no frequency of the part could be computed{doubts}."
    if not true:
        return f"Not judged, since nothing is expected of the part{doubts}; {unseen}."
    shown = f"{words.listed(true)} within the tolerance"
    return f"Physical as far as these readings can show: {shown}{doubts}; {unseen}."


def _not_believable(against: Sequence[Finding]) -> str:
    """Each property once, with all its bands; the reason from the worst finding of the first property."""
    by_name: dict[str, list[Finding]] = {}
    for finding in against:
        by_name.setdefault(_NOT_AS.get(finding.kind, ""), []).append(finding)
    clauses = []
    for name, group in by_name.items():
        main = [f for f in group if f.kind == group[0].kind]
        worst = max(main, key=lambda f: f.worst or 0.0)
        if not name:
            clauses += [_lower(f.text.rstrip(".")) for f in group]
            continue
        where = "; ".join(dict.fromkeys(f.where for f in main if f.where))
        place = f" ({where})" if where else ""
        clauses.append(f"as a {name} part {_bands(main)}{place}: {_reason(worst)}")
    known = [c for c in clauses if c.startswith("as a")]
    other = [c for c in clauses if not c.startswith("as a")]
    if not known:
        return f"Not believable: {'; '.join(other)}"
    rest = [f"nor {c}" for c in known[1:]] + other
    return "; ".join([f"Not believable {known[0]}", *rest])


def _lower(text: str) -> str:
    return text[:1].lower() + text[1:]


def _bands(group: Sequence[Finding]) -> str:
    named = sorted({(f.from_hz, f.to_hz) for f in group if f.from_hz is not None and f.to_hz is not None})
    if not named:
        return "at some frequencies"
    if len(named) > 3:
        return f"in {len(named)} bands {_lower(at_band(named[0][0], max(to for _, to in named)))}"
    return words.listed(_lower(at_band(*band)) for band in named)


def _reason(finding: Finding) -> str:
    """The finding's sentence without its band, which the verdict has already named."""
    text = finding.text.split(";")[0].rstrip(".")
    if finding.from_hz is None or finding.to_hz is None:
        return _lower(text)
    start = at_band(finding.from_hz, finding.to_hz)
    return text.removeprefix(start).strip() if text.startswith(start) else _lower(text)


def _places(warnings: Sequence[Finding]) -> str:
    """Kinds and places of the warnings, each place once with all it spans."""
    spans: dict[str, dict[str, list[float]]] = {}
    for finding in warnings:
        ends = spans.setdefault(finding.kind, {}).setdefault(finding.where or "the part", [])
        ends += [hz for hz in (finding.from_hz, finding.to_hz) if hz is not None]
    said = []
    for kind, by_place in spans.items():
        places = [f"{p} ({words.band(min(ends), max(ends))})" if ends else p for p, ends in by_place.items()]
        said.append(f"{_plain(kind)} at {_few(places)}")
    return "; ".join(said)


def _plain(kind: str) -> str:
    return {"missing": "missing numbers", "not-judged": "missing numbers"}.get(kind, kind.replace("-", " "))


def _few(places: Sequence[str], most: int = 3) -> str:
    if len(places) <= most:
        return words.listed(places)
    return f"{', '.join(places[:most])} and {len(places) - most} more"


def _unseen(blind_spots: Sequence[BlindSpot]) -> str:
    causes = [f"{b.cause} at {b.where}" if b.where else b.cause for b in blind_spots]
    return f"what they could not have shown: {_few(causes) if causes else _ALWAYS_UNSEEN}"
