"""Which program makes a record: the same inputs, seed and program give the same bytes."""

from __future__ import annotations

import hashlib
import platform
from functools import cache
from importlib.metadata import version
from pathlib import Path

import aggregator
import models

# What a record's numbers depend on, beside the inputs: our own modules, and the libraries that compute.
_ROOMS = ("estimate", "seats", "shelf_life")
_LIBRARIES = ("arviz-stats", "numba", "numpy", "nutpie", "pymc", "pytensor", "scipy")


@cache
def program_version() -> str:
    """Name the program: its version, a hash of the code behind the numbers, the libraries, Python.

    The hash tells two states of the code apart that bear one version.
    """
    digest = hashlib.sha256()
    for path in _modules():
        digest.update(f"{path.parent.name}/{path.name}\n".encode() + path.read_bytes())
    libraries = (f"{name} {version(name)}" for name in _LIBRARIES)
    own = f"fieldfold {version('fieldfold')} (code {digest.hexdigest()[:12]})"
    return ", ".join((own, *libraries, f"Python {platform.python_version()}"))


def _modules() -> list[Path]:
    top = Path(aggregator.__file__).parent
    folders = [*(top / room for room in _ROOMS), Path(models.__file__).parent]
    return [path for folder in folders for path in sorted(folder.glob("*.py"))]
