"""Records on disk: each in a file of its own, whole or not there."""

from __future__ import annotations

import json
import os
import tempfile
from pathlib import Path

import xarray as xr

from aggregator.errors import MachineError
from aggregator.refits.fit_record import FitRecord

FITS = "fits"
_SUFFIX = ".nc"
_FACTS = "facts"
_RESUME = "Finished fits are kept: the same command goes on from them."


def make_store(store: Path) -> None:
    """Make the folder that records go to, and see that it can be written before anything is fitted.

    Raises
    ------
    MachineError
        If it cannot.
    """
    folder = store / FITS
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=folder):
            pass
    except OSError as error:
        raise MachineError(
            f"{folder} cannot be written: {error.strerror or error}. Make room there, or name another folder."
        ) from error


def has_record(key: str, *, store: Path) -> bool:
    """Tell whether the record of a fit is there."""
    return _path(key, store).is_file()


def write_record(record: FitRecord, *, store: Path) -> Path:
    """Write a record under its key, atomically.

    Raises
    ------
    MachineError
        If the disk is full or cannot be written; nothing is left of the record then.
    """
    path = _path(record.key, store)
    data = record.data.assign_attrs({_FACTS: json.dumps(dict(record.facts), ensure_ascii=False)})
    # To bytes first: so the system's own words say what is wrong with a disk, and not those of HDF5.
    content = bytes(data.to_netcdf(engine="h5netcdf"))
    temporary: Path | None = None
    try:
        with tempfile.NamedTemporaryFile(dir=path.parent, prefix="part-", delete=False) as file:
            temporary = Path(file.name)
            file.write(content)
            file.flush()
            os.fsync(file.fileno())
        temporary.replace(path)
    except OSError as error:
        if temporary is not None:
            temporary.unlink(missing_ok=True)
        raise MachineError(f"{path} cannot be written: {error.strerror or error}. {_RESUME}") from error
    return path


def read_record(key: str, *, store: Path) -> FitRecord:
    """Read the record of a fit.

    Raises
    ------
    MachineError
        If the file cannot be read, or is not the record of a fit.
    """
    path = _path(key, store)
    try:
        data = xr.load_dataset(path, engine="h5netcdf")
        facts = json.loads(data.attrs.pop(_FACTS))
    except (OSError, KeyError, ValueError) as error:
        raise MachineError(
            f"{path} cannot be read as the record of a fit ({error}). Delete it: the fit is then made again."
        ) from error
    return FitRecord(key, data, facts)


def _path(key: str, store: Path) -> Path:
    return store / FITS / f"{key}{_SUFFIX}"
