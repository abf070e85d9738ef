"""The command line: ``python -m deembed run`` and ``python -m deembed demo``."""

from __future__ import annotations

import argparse
import sys
import time
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from deembed import words
from deembed.errors import DeembedError

if TYPE_CHECKING:
    from deembed.job.outcome import Outcome
    from deembed.job.stages import Progress

__all__ = ["main"]

DONE, CONTRADICTED, NOT_RUN = 0, 1, 2
# A run shorter than this needs no progress bar [s].
_PATIENCE = 0.5
_CODES = (
    "Exit codes: 0 done; 1 done, and a finding contradicts what the job expects; 2 the job could not be run."
)


def main(arguments: Sequence[str] | None = None) -> int:
    """Run a command.

    Parameters
    ----------
    arguments : sequence of str, optional
        Words of the command line; the process's own when not given.

    Returns
    -------
    int
        0 done; 1 done, and a finding contradicts what the job expects; 2 the job could not be run.
    """
    chosen = _parser().parse_args(arguments)
    try:
        return chosen.action(chosen)
    except DeembedError as error:
        print(f"deembed: {error}", file=sys.stderr)
    except OSError as error:
        print(f"deembed: {error.filename or 'a file'}: {error.strerror or error}", file=sys.stderr)
    except KeyboardInterrupt:
        print("deembed: stopped; nothing was written", file=sys.stderr)
    return NOT_RUN


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="python -m deembed",
        description="From raw analyzer readings to S-parameters at a part's own planes, and whether to "
        "believe them.",
        epilog=_CODES,
    )
    commands = parser.add_subparsers(metavar="COMMAND", required=True)
    run = commands.add_parser(
        "run",
        help="run a job file and write part, archive, findings and report",
        description="Run a job file (or the archive of an earlier run) and write part.sNp, outcome.nc, "
        "findings.json and report.html: all of them or none. Prints the verdict, then the findings.",
        epilog=_CODES,
    )
    run.add_argument("job", help="job.toml, or an outcome.nc to run again")
    run.add_argument(
        "--out", required=True, metavar="DIR", help="folder for the four files; made when missing"
    )
    run.set_defaults(action=_run)
    demo = commands.add_parser(
        "demo",
        help="write a complete invented job to try things on",
        description="Write the folder of a complete job: readings, standards, fixture and job file of an "
        "invented antenna splitter. Run it with: python -m deembed run DIR/job.toml --out out/",
    )
    demo.add_argument("directory", metavar="DIR", help="folder to write")
    demo.add_argument(
        "--mistake", metavar="NAME", help="plant one mistake; an unknown name lists those known"
    )
    demo.set_defaults(action=_demo)
    return parser


def _run(chosen: argparse.Namespace) -> int:
    from deembed.job.job import load_job

    with _Bar() as bar:
        outcome = load_job(chosen.job).run(progress=bar.show)
        bar.show(1.0, "writing the files")
        written = outcome.write(chosen.out)
    print(_said(outcome))
    print(f"\nWritten to {chosen.out}: {words.listed(path.name for path in written)}.")
    return CONTRADICTED if outcome.contradicts else DONE


def _said(outcome: Outcome) -> str:
    """Verdict first, then findings and what could not have been seen."""
    lines = [outcome.verdict]
    if outcome.findings:
        lines += ["", "Findings:"]
        lines += [f"  {f.severity}: {f'{f.where}: ' if f.where else ''}{f.text}" for f in outcome.findings]
    if outcome.blind_spots:
        lines += ["", "What this job could not have shown:"]
        lines += [f"  {b.text} To see it: {b.reading}." for b in outcome.blind_spots]
    return "\n".join(lines)


def _demo(chosen: argparse.Namespace) -> int:
    from deembed.simulate.demo import write_demo

    path = write_demo(chosen.directory, mistake=chosen.mistake)
    print(f"Wrote a demo job to {chosen.directory}. Run it with:")
    print(f"  python -m deembed run {path} --out out/")
    return DONE


class _Bar:
    """A progress bar on stderr, only on a terminal and only once the work has taken a while."""

    def __init__(self) -> None:
        self._bar: Any = None
        self._start = time.monotonic()

    def __enter__(self) -> _Bar:
        return self

    def __exit__(self, *_: object) -> None:
        if self._bar is not None:
            self._bar.close()

    @property
    def show(self) -> Progress:
        """The function to hand to a run."""
        return self._show

    def _show(self, fraction: float, what: str) -> None:
        if not sys.stderr.isatty() or time.monotonic() - self._start < _PATIENCE:
            return
        if self._bar is None:
            from tqdm import tqdm

            self._bar = tqdm(total=100, file=sys.stderr, leave=False, bar_format="{l_bar}{bar}| {elapsed}")
        self._bar.update(round(100 * fraction) - self._bar.n)
        self._bar.set_description(what)
