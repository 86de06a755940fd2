"""Fly it: air, airframe, control path, script, station keeping, and the passes over time.

The compiled kernels are kept in a cache folder named after the text of this room: numba looks only
at the file a kernel stands in, so a change in a function that it calls would otherwise go unseen.
"""

from __future__ import annotations

import hashlib
import os
import tempfile
from pathlib import Path

import numba


def kernel_cache() -> Path:
    """Folder of the compiled kernels of exactly this source text, made if it can be."""
    digest = hashlib.sha256()
    for path in sorted(Path(__file__).parent.glob("*.py")):
        digest.update(path.read_bytes())
    digest.update(numba.__version__.encode())
    base = Path(os.environ.get("XDG_CACHE_HOME") or Path.home() / ".cache")
    for root in (base, Path(tempfile.gettempdir())):
        folder = root / "latepull" / f"kernels-{digest.hexdigest()[:16]}"
        try:
            folder.mkdir(parents=True, exist_ok=True)
        except OSError:
            continue
        if os.access(folder, os.W_OK):
            return folder
    return Path(tempfile.mkdtemp(prefix="latepull-"))


numba.config.CACHE_DIR = str(kernel_cache())  # type: ignore[attr-defined]
