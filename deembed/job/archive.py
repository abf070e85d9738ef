"""One netCDF file that holds everything of an outcome: what went in, each step, what came out, and the job.

Dims that a group does not share with the part have names of their own (``reading_port_out``,
``analyzer_port_out``, ``round_port_out``), because xarray wants the dims of a group to agree with those of
the groups around it.
"""

from __future__ import annotations

import datetime
import json
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
import xarray as xr

from deembed.errors import FileError
from deembed.findings import BlindSpot, Finding, Suspect
from deembed.job.inputs import Input, Inputs
from deembed.job.validate import validate

if TYPE_CHECKING:
    from deembed.job.job import Job
    from deembed.job.outcome import Outcome

__all__ = ["job_from_archive", "read_archive", "write_archive"]

FORMAT = 1
_READING = {d: f"reading_{d}" for d in ("frequency", "port_out", "port_in", "z0")}
_ANALYZER = {d: f"analyzer_{d}" for d in ("port_out", "port_in", "z0")}
_ROUND = {d: f"round_{d}" for d in ("port_out", "port_in", "z0")}


def write_archive(outcome: Outcome, path: str | Path) -> None:
    """Write an outcome to a netCDF file.

    Parameters
    ----------
    outcome : Outcome
    path : str or Path
        ``outcome.nc``.
    """
    groups = {
        "/": _root(outcome),
        **_raw(outcome),
        **{
            f"/rounds/{i}": _put(one.to_dataset(name="s"), _ROUND, part_ports=str(one.name))
            for i, one in enumerate(outcome.rounds, start=1)
        },
        "/assembled": _put(outcome.assembled.to_dataset(name="s"), {}),
    }
    if outcome.terms is not None:
        groups["/terms"] = _put(outcome.terms, _ANALYZER)
    if outcome.disagreement is not None:
        groups["/disagreement"] = _put(outcome.disagreement.to_dataset(name="disagreement"), {})
    if outcome.shell is not None:
        groups["/shell"] = _put(outcome.shell, {})
    tree = xr.DataTree.from_dict(groups)
    tree.to_netcdf(path, engine="h5netcdf", write_inherited_coords=True)


def _root(outcome: Outcome) -> xr.Dataset:
    import deembed

    root = _put(outcome.metrics.assign(part=outcome.part.rename(None)), {})
    return root.assign_attrs(
        part_attributes=_json(outcome.part.attrs),
        part_coords=_json([c for c in outcome.part.coords if c not in outcome.metrics.coords]),
        format_version=FORMAT,
        title=outcome.job.spec.job.title,
        verdict=outcome.verdict,
        job_name=outcome.job.name,
        job_toml=outcome.job.text,
        findings=_json([f.as_dict() for f in outcome.findings]),
        suspects=_json([s.as_dict() for s in outcome.suspects]),
        blind_spots=_json([b.as_dict() for b in outcome.blind_spots]),
        inputs=_json(_inputs(outcome)),
        versions=_json({"deembed": deembed.__version__, "numpy": np.__version__, "xarray": xr.__version__}),
        created=datetime.datetime.now(datetime.UTC).isoformat(timespec="seconds"),
    )


def _inputs(outcome: Outcome) -> list[dict]:
    """Every input once: its name, the job keys that use it, its hash and its group."""
    keys: dict[str, list[str]] = {}
    for key, name in outcome.job.input_names():
        keys.setdefault(name, []).append(key)
    inputs = outcome.job.inputs
    return [
        {
            "name": name,
            "keys": used,
            "sha256": inputs.get(name, key=used[0]).sha256,
            "edited": inputs.get(name, key=used[0]).edited,
            "group": f"raw/{i}",
        }
        for i, (name, used) in enumerate(keys.items(), start=1)
    ]


def _raw(outcome: Outcome) -> dict[str, xr.Dataset]:
    groups = {}
    inputs = outcome.job.inputs
    for entry in _inputs(outcome):
        key, name = entry["keys"][0], entry["name"]
        about = {"name": name, "role": ", ".join(entry["keys"]), "sha256": entry["sha256"]}
        if key == "calibration.kit":
            groups[f"/{entry['group']}"] = xr.Dataset(attrs={**about, "text": inputs.get(name, key=key).text})
        else:
            data = inputs.sparams(name, key=key).to_dataset(name="s")
            groups[f"/{entry['group']}"] = _put(data, _READING, **about)
    return groups


def _put(data: xr.Dataset, names: Mapping[str, str], **attrs: str) -> xr.Dataset:
    """A dataset as netCDF can hold it: dims renamed, attributes as JSON beside the plain ones."""
    plain = {
        k: v for k, v in data.attrs.items() if isinstance(v, (str, int, float)) and not isinstance(v, bool)
    }
    kept = {"attributes": _json(data.attrs), "variable_attributes": _json(_variable_attrs(data))}
    here = {k: v for k, v in names.items() if k in data.dims or k in data.coords}
    out = data.rename(here).copy()
    for variable in out.variables.values():
        variable.attrs = {k: v for k, v in variable.attrs.items() if isinstance(v, str)}
    out.attrs = {**plain, **kept, **attrs}
    return out


def _variable_attrs(data: xr.Dataset) -> dict[str, dict]:
    return {str(k): v.attrs for k, v in data.variables.items() if v.attrs}


def _take(node: Any, names: Mapping[str, str]) -> xr.Dataset:
    """The dataset that `_put` was given."""
    data = node.to_dataset(inherit=False).load()
    # Labels that a group shares with the root are the root's.
    shared = [d for d in data.dims if d not in data.coords and d in node.coords]
    data = data.assign_coords({d: node.coords[d].load() for d in shared})
    back = {v: k for k, v in names.items() if v in data.dims or v in data.coords}
    data = data.rename(back)
    for variable in data.variables.values():
        variable.attrs, variable.encoding = {}, {}
    for key, attrs in json.loads(data.attrs.get("variable_attributes", "{}")).items():
        data.variables[key].attrs = attrs
    data.attrs = json.loads(data.attrs.get("attributes", "{}"))
    data.encoding = {}
    return data


def _json(value: Any) -> str:
    return json.dumps(value, default=_plain_number)


def _plain_number(value: Any) -> Any:
    if isinstance(value, (np.ndarray, np.generic)):
        return value.tolist()
    raise TypeError(f"{value!r} cannot be kept in an archive")


def _open(path: Path) -> xr.DataTree:
    if not path.is_file():
        raise FileError("no such file", where=str(path), do="Give the path of an outcome.nc.")
    try:
        tree = xr.open_datatree(path, engine="h5netcdf")
    except (OSError, ValueError, KeyError) as error:
        raise FileError(f"this is not a netCDF file that can be opened ({error})", where=str(path)) from error
    if "job_toml" not in tree.attrs:
        tree.close()
        raise FileError(
            "this netCDF file holds no job", where=str(path), do="Give an outcome.nc written by a run."
        )
    if tree.attrs["format_version"] > FORMAT:
        version = tree.attrs["format_version"]
        tree.close()
        raise FileError(
            f"format version {version} is newer than this program reads ({FORMAT})",
            where=str(path),
            do="Update deembed.",
        )
    return tree


def job_from_archive(path: Path) -> Job:
    """The job an archive holds, with the readings it holds; nothing else is read when it runs.

    Raises
    ------
    FileError
        Not an archive of an outcome.
    """
    with _open(path) as tree:
        return _job(tree, path)


def _job(tree: xr.DataTree, path: Path) -> Job:
    from deembed.job.job import Job

    given = {}
    for entry in json.loads(tree.attrs["inputs"]):
        node, name = tree[entry["group"]], entry["name"]
        if "text" in node.attrs:
            given[name] = Input(name, entry["sha256"], text=node.attrs["text"], edited=entry["edited"])
        else:
            data = _array(_take(node, _READING), "s")
            given[name] = Input(name, entry["sha256"], data=data, edited=entry["edited"])
    name, text = tree.attrs["job_name"], tree.attrs["job_toml"]
    return Job(text, validate(text, name=name), Inputs(None, given, f"the archive {path.name}"), name)


def _array(data: xr.Dataset, name: str) -> xr.DataArray:
    return data[name].rename(None)


def read_archive(path: Path) -> Outcome:
    """The outcome an archive holds, without running anything.

    Raises
    ------
    FileError
        Not an archive of an outcome.
    """
    from deembed.job.outcome import Outcome

    with _open(path) as tree:
        job = _job(tree, path)
        root = _take(tree, {})
        part = _array(root, "part").assign_attrs(json.loads(tree.attrs["part_attributes"]))
        rounds = [tree[f"rounds/{i}"] for i in range(1, len(tree["rounds"].children) + 1)]
        return Outcome(
            job=job,
            part=part,
            metrics=root.drop_vars(["part", *json.loads(tree.attrs["part_coords"])]),
            findings=tuple(Finding.from_dict(f) for f in json.loads(tree.attrs["findings"])),
            blind_spots=tuple(BlindSpot(**b) for b in json.loads(tree.attrs["blind_spots"])),
            verdict=tree.attrs["verdict"],
            raw={e["name"]: job.inputs.sparams(e["name"], key=e["keys"][0]) for e in _touchstone(tree)},
            terms=_take(tree["terms"], _ANALYZER) if "terms" in tree.children else None,
            rounds=tuple(_array(_take(r, _ROUND), "s").rename(r.attrs["part_ports"]) for r in rounds),
            assembled=_array(_take(tree["assembled"], {}), "s"),
            disagreement=_disagreement(tree),
            shell=_take(tree["shell"], {}) if "shell" in tree.children else None,
            suspects=tuple(Suspect(**s) for s in json.loads(tree.attrs["suspects"])),
        )


def _touchstone(tree: xr.DataTree) -> list[dict]:
    return [e for e in json.loads(tree.attrs["inputs"]) if not e["keys"][0].startswith("calibration.kit")]


def _disagreement(tree: xr.DataTree) -> xr.DataArray | None:
    if "disagreement" not in tree.children:
        return None
    return _take(tree["disagreement"], {})["disagreement"]
