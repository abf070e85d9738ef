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
# Causes before symptoms: a calibration at odds with itself explains what rounds and part then show.
_LOOK_FIRST = ("tracking-sign", "redundancy", "arm-direction", "line-phase", "terms-size", "disagreement")
_MOST_PLACES = 2
# Said when the job's blind spots were not worked out: true of any job.
_ALWAYS_UNSEEN = (
    "a mistake that leaves a passive part behind, such as a wrong length, looks just like a good part"
)
_UNSEEN = {
    "arm-reversed": "{where} being the wrong way round",
    "standards-exchanged": "open and short exchanged at {where}",
    "thru-length": "a wrong length of {where}",
    "line-length": "a wrong length of {where}",
    "reflect-sign": "a wrong sign of {where}",
    "calibration": "a mistake in the calibration behind these readings",
}


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
        Contradictions first, with band and worst size; then where to look first; without a contradiction also
        what these readings could not have shown.

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
        doubts = f"; look first at {_places(warnings)}" if warnings else ""
        return f"{_not_believable(against)}{doubts}."
    doubts = f"; but look at {_places(warnings)}" if warnings else ""
    unseen = _unseen(blind_spots)
    true = [name for name, value in (expect or {}).items() if value]
    if any(f.kind == "not-judged" for f in warnings):
        return f"Not judged, since no frequency of the part could be computed{doubts}."
    if not true:
        return f"Not judged, since nothing is expected of the part{doubts}; {unseen}."
    shown = f"{words.listed(true)} within the tolerance"
    return f"Physical as far as these readings can show: {shown}{doubts}; {unseen}."


def _not_believable(against: Sequence[Finding]) -> str:
    """Each property with the band it fails in; the reason of the worst finding of the first property."""
    by_name: dict[str, list[Finding]] = {}
    for finding in against:
        by_name.setdefault(_NOT_AS.get(finding.kind, ""), []).append(finding)
    other = [_lower(f.text.rstrip(".")) for f in by_name.pop("", [])]
    if not by_name:
        return f"Not believable: {'; '.join(other)}"
    # Gain first: it is the plainest impossibility, whatever else is wrong as well.
    names = sorted(by_name, key=("passive", "reciprocal", "lossless").index)
    first = by_name[names[0]]
    main = [f for f in first if f.kind == first[0].kind]
    worst = max(main, key=lambda f: f.worst or 0.0)
    ports = ", ".join(dict.fromkeys(f.where for f in main if f.where))
    place = f" ({ports})" if ports and len(main) == 1 else ""
    head = f"Not believable as a {names[0]} part {_span(first)}{place}: {_reason(worst)}"
    rest = [f"nor as a {name} part {_span(by_name[name])}" for name in names[1:]]
    return "; ".join([head, *rest, *other])


def _lower(text: str) -> str:
    return text[:1].lower() + text[1:]


def _span(group: Sequence[Finding]) -> str:
    """The band from the lowest to the highest frequency of the group; how many bands, where they are many."""
    bands = {(f.from_hz, f.to_hz) for f in group if f.from_hz is not None and f.to_hz is not None}
    if not bands:
        return "at some frequencies"
    whole = _lower(at_band(min(low for low, _ in bands), max(high for _, high in bands)))
    return whole if len(bands) == 1 else f"in {len(bands)} bands {whole}"


def _reason(finding: Finding) -> str:
    """The finding's sentence without its band, which the verdict has already named."""
    text = finding.text.split(";")[0].rstrip(".")
    if finding.from_hz is None or finding.to_hz is None:
        return _lower(text)
    start = at_band(finding.from_hz, finding.to_hz)
    return text.removeprefix(start).strip() if text.startswith(start) else _lower(text)


def _places(warnings: Sequence[Finding]) -> str:
    """Where to look first: causes before symptoms, each place once, few enough to act on."""
    ranked = sorted(warnings, key=lambda f: _LOOK_FIRST.index(f.kind) if f.kind in _LOOK_FIRST else 3)
    said = list(dict.fromkeys(f"{f.where or 'the part'} ({_plain(f.kind)})" for f in ranked))
    if len(said) <= _MOST_PLACES:
        return words.listed(said)
    return f"{', then '.join(said[:_MOST_PLACES])}, and {len(said) - _MOST_PLACES} more below"


def _plain(kind: str) -> str:
    return {"missing": "missing numbers", "not-judged": "missing numbers"}.get(kind, kind.replace("-", " "))


def _unseen(blind_spots: Sequence[BlindSpot]) -> str:
    """Mistakes that would leave no trace, one phrase per kind of mistake."""
    by_cause: dict[str, list[str]] = {}
    for spot in blind_spots:
        by_cause.setdefault(spot.cause, []).append(spot.where)
    phrases = [
        _UNSEEN.get(cause, f"{cause.replace('-', ' ')} at {{where}}").format(
            where=words.listed(places, last="or")
        )
        for cause, places in by_cause.items()
    ]
    return f"what they could not have shown: {'; '.join(phrases) if phrases else _ALWAYS_UNSEEN}"
