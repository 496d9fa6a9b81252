"""A record is on disk whole or not at all, and the machine's troubles are named as such."""

from __future__ import annotations

import errno
import os
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from aggregator.errors import MachineError
from aggregator.refits.fit_record import FitRecord
from aggregator.refits.record_files import has_record, make_store, read_record, write_record


def record(key: str = "lakes-2031-03-01-ab") -> FitRecord:
    rng = np.random.default_rng(1)
    data = xr.Dataset(
        {
            "national_support": (("draw", "party"), rng.random((20, 3), dtype=np.float32)),
            "seats_polling_day": (("draw", "party"), rng.integers(0, 99, (20, 3)).astype(np.int16)),
        },
        coords={"party": ["HU", "UP", "OTH"]},
    )
    facts = {"as_of": "2031-03-01", "passed": True, "seconds": {"all": 1.25}, "verdict": "Übung …"}
    return FitRecord(key, data, facts)


def test_a_record_comes_back_as_it_was(tmp_path):
    make_store(tmp_path)
    assert not has_record(record().key, store=tmp_path)
    path = write_record(record(), store=tmp_path)
    assert path == tmp_path / "fits" / "lakes-2031-03-01-ab.nc"
    back = read_record(record().key, store=tmp_path)
    assert back.data.identical(record().data)
    assert back.facts == record().facts


def test_the_same_record_gives_the_same_bytes(tmp_path):
    make_store(tmp_path)
    assert (
        write_record(record("a"), store=tmp_path).read_bytes()
        == write_record(record("b"), store=tmp_path).read_bytes()
    )


def test_a_full_disk_leaves_nothing_half_written_and_what_was_there(tmp_path, monkeypatch):
    make_store(tmp_path)
    write_record(record("kept"), store=tmp_path)

    def full(_: int) -> None:
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    monkeypatch.setattr("aggregator.refits.record_files.os.fsync", full)
    with pytest.raises(MachineError, match=r"cannot be written: No space left on device\. Finished fits are"):
        write_record(record("lost"), store=tmp_path)
    assert [p.name for p in (tmp_path / "fits").iterdir()] == ["kept.nc"]
    assert MachineError.exit_code == 5


def test_a_store_that_cannot_be_written_is_found_out_at_once(tmp_path):
    (tmp_path / "fits").write_text("a file")
    with pytest.raises(MachineError, match="cannot be written: File exists"):
        make_store(tmp_path)


@pytest.mark.parametrize("content", [b"", b"no record", None])
def test_a_damaged_record_is_named_and_not_made_again_in_silence(tmp_path: Path, content: bytes | None):
    make_store(tmp_path)
    path = write_record(record("lakes"), store=tmp_path)
    path.write_bytes(content if content is not None else path.read_bytes()[:2000])
    with pytest.raises(MachineError, match=r"lakes\.nc cannot be read as the record of a fit .*Delete it"):
        read_record("lakes", store=tmp_path)
