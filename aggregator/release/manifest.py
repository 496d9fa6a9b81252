"""The manifest of a release: what went in, what came out, with what program, seed and settings."""

from __future__ import annotations

import hashlib
import json
import platform
from collections.abc import Iterable, Mapping
from importlib import metadata
from pathlib import Path

from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.release.cautions import PublicationStatus
from aggregator.verdict import Verdict

MANIFEST = "manifest.json"
LIBRARIES = (
    "altair",
    "arviz",
    "h5netcdf",
    "numba",
    "numpy",
    "nutpie",
    "pandas",
    "pymc",
    "scipy",
    "vl-convert-python",
    "xarray",
)


def file_hash(path: Path) -> str:
    """SHA-256 of a file, as hexadecimal digits."""
    with path.open("rb") as stream:
        return hashlib.file_digest(stream, "sha256").hexdigest()


def inputs_hash(hashes: Mapping[str, str]) -> str:
    """One fingerprint for a set of named files, whatever their order."""
    lines = "".join(f"{name}\t{digest}\n" for name, digest in sorted(hashes.items()))
    return hashlib.sha256(lines.encode()).hexdigest()


def name_in_folder(path: Path, *, folder: Path) -> str:
    """Name of an input inside the contest folder; the bare name for a file from elsewhere."""
    try:
        return path.resolve().relative_to(folder.resolve()).as_posix()
    except ValueError:
        return path.name


def earlier_runs(releases: Path, *, fingerprint: str) -> list[dict[str, object]]:
    """Releases made from the same inputs, oldest name first: a choice among them is then visible.

    Parameters
    ----------
    releases
        The folder ``releases/``; it need not exist.
    fingerprint
        Of the inputs, from ``inputs_hash``.
    """
    found: list[dict[str, object]] = []
    for manifest in sorted([*releases.glob(f"*/{MANIFEST}"), *releases.glob(f"failed/*/{MANIFEST}")]):
        try:
            earlier = json.loads(manifest.read_text(encoding="utf-8"))
            same = earlier["inputs_sha256"] == fingerprint
        except (OSError, ValueError, KeyError, TypeError):
            continue  # a folder that is not one of ours, or was edited: `audit` is the place to complain
        if same:
            found.append(
                {
                    "release": manifest.parent.relative_to(releases).as_posix(),
                    "seed": earlier.get("seed"),
                    "checks_passed": earlier.get("checks", {}).get("passed"),
                }
            )
    return found


def build_manifest(
    folder: Path,
    *,
    inputs: DeskInputs,
    input_hashes: Mapping[str, str],
    verdict: Verdict,
    status: PublicationStatus,
    settings: Mapping[str, object],
    headlines: Iterable[str],
    earlier: list[dict[str, object]],
) -> dict[str, object]:
    """Describe a release folder that is otherwise complete.

    Holds no absolute path and no time of day, so that two runs with the same inputs, seed and versions
    write the same manifest, but for the list of earlier runs.

    Parameters
    ----------
    folder
        Where the release was built; every file in it is hashed.
    input_hashes
        SHA-256 by file name, of the copies in the release.
    settings
        The run's settings; ``seed`` among them.
    earlier
        Earlier runs on the same inputs.
    """
    files = sorted(path for path in folder.rglob("*") if path.is_file())
    return {
        "fieldfold": _version("fieldfold"),
        "contest": inputs.contest.title,
        "run_date": inputs.run_date.isoformat(),
        "polling_day": inputs.contest.last_polling_day.isoformat(),
        "headlines": list(headlines),
        "not_for_publication": status.not_for_publication,
        "not_for_publication_because": list(status.reasons),
        "unpublished_polls": list(status.unpublished),
        "checks": {
            "passed": verdict.passed,
            "text": verdict.text,
            "table": json.loads(verdict.table.to_json(orient="records")),
        },
        "seed": settings.get("seed"),
        "settings": dict(settings),
        "warnings": [str(problem) for problem in inputs.warnings],
        "versions": {"python": platform.python_version(), **library_versions()},
        "inputs_sha256": inputs_hash(input_hashes),
        "inputs": dict(input_hashes),
        "outputs": {path.relative_to(folder).as_posix(): file_hash(path) for path in files},
        "earlier_runs_on_these_inputs": earlier,
    }


def write_manifest(folder: Path, *, manifest: Mapping[str, object]) -> None:
    """Write ``manifest.json``, the last file of a release."""
    text = json.dumps(manifest, indent=2, ensure_ascii=False, default=str)
    (folder / MANIFEST).write_text(text + "\n", encoding="utf-8")


def library_versions() -> dict[str, str | None]:
    """Give the version of every library that numbers and charts depend on."""
    return {name: _version(name) for name in LIBRARIES}


def _version(name: str) -> str | None:
    try:
        return metadata.version(name)
    except metadata.PackageNotFoundError:
        return None
