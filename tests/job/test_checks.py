"""Check standards in a job: agreement is a note, disagreement a warning with its size, bad entries one clear error."""

import re

import numpy as np
import pytest

from deembed.errors import GridError, JobError, PortError
from deembed.job import load_job
from deembed.labels import sparams

PAD = np.array([[0.05, 0.7], [0.7, -0.02]])


@pytest.fixture
def with_check(bench, make):
    """A job with a check standard; `off` is added to its known S21."""

    def build(off=0.0, *, drive="every-port", **more):
        path = bench(method="solt", drive=drive)
        f = make["grid"]()
        first_only = drive == "first-port-only"
        pad = sparams(np.broadcast_to(PAD, (f.size, 2, 2)), f)
        if first_only:
            pad = pad.sel(port_out=[1], port_in=[1])
        on = (1,) if first_only else (1, 2)
        n = len(on)
        make["save"](path.parent, f"raw/pad.s{n}p", make["read"](pad, on=on))
        known = pad.copy(deep=True)
        known.values[:, -1, 0] += off
        make["save"](path.parent, f"known/pad.s{n}p", known)
        check = {
            "name": "pad 3", "file": f"raw/pad.s{n}p", "reference": f"known/pad.s{n}p", "analyzer_ports": list(on),
            "uncertainty": 0.004, **more,
        }  # fmt: skip
        return load_job(path).changed({"checks": [check]})

    return build


def checked(outcome):
    return [f for f in outcome.findings if f.kind == "check-standard"]


@pytest.mark.parametrize("drive", ["every-port", "first-port-only"])
def test_a_good_calibration_gives_the_known_part_back(with_check, drive):
    (found,) = checked(with_check(drive=drive).run())
    assert found.severity == "note" and found.worst < 1e-9
    assert "Check standard pad 3 agrees with its known values" in found.text
    assert found.where == ("port 1, port 2" if drive == "every-port" else "port 1")


def test_a_part_that_is_off_is_a_warning_with_its_normalized_error(with_check):
    (found,) = checked(with_check(0.0245).run())
    assert found.severity == "warning" and found.worst == pytest.approx(2.5)
    assert "S21 of check standard pad 3 is off its known value by up to 2.5 times" in found.text
    (found,) = checked(with_check(0.0245, reference_uncertainty=0.02).run())
    assert found.severity == "note"


def test_its_files_are_kept_in_the_archive_and_named_in_words(with_check, tmp_path):
    outcome = with_check().run()
    outcome.write(tmp_path / "out")
    assert checked(load_job(tmp_path / "out/outcome.nc").run()) == checked(outcome)
    report = (tmp_path / "out/report.html").read_text()
    assert "known values of check standard 1" in report


def test_a_change_of_uncertainty_runs_only_the_check_again(with_check):
    from deembed.job import Cache

    cache = Cache()
    job = with_check()
    job.run(cache=cache)
    before = dict(cache.executed)
    job.changed({"checks[0].uncertainty": 0.01}).run(cache=cache)
    again = {name for name, count in cache.executed.items() if count > before.get(name, 0)}
    assert again == {"checks"}


@pytest.mark.parametrize(
    ("edit", "error", "message"),
    [
        ({"uncertainty": 0}, JobError, "both uncertainties are zero. State a standard uncertainty"),
        ({"uncertainty": -1.0}, JobError, "checks[0].uncertainty"),
        ({"analyzer_ports": [1, 3]}, JobError, "checks[0].analyzer_ports"),
        ({"analyzer_ports": [1], "file": "raw/round.s1p"}, JobError, "raw/round.s1p"),
        ({"refrence": "x"}, JobError, "Did you mean reference?"),
    ],
)
def test_bad_entries(with_check, edit, error, message):
    with pytest.raises((error, ValueError), match=re.escape(message)):
        with_check(**edit).run()


def test_two_ports_cannot_be_checked_where_one_drives(with_check):
    job = with_check(drive="first-port-only")
    with pytest.raises(JobError, match=re.escape("ports [1, 2] cannot be checked where only port 1 drives")):
        job.changed({"checks[0].analyzer_ports": [1, 2]})


def test_another_grid_or_too_few_ports(with_check, make):
    job = with_check()
    folder_file = "known/pad.s2p"
    other = sparams(np.broadcast_to(PAD, (5, 2, 2)), make["grid"](5))
    with pytest.raises(GridError, match="known/pad.s2p"):
        job.with_reading(folder_file, other).run()
    with pytest.raises(PortError, match="needed analyzer ports 1 and 2"):
        job.with_reading(folder_file, sparams(np.zeros((21, 1, 1)), make["grid"]())).run()
