"""What FFTW learnt about this machine, kept between runs in a cache folder.

One small JSON file for each kind of plan, named by the hash of what it is good for. A cache that cannot be
read or written costs planning time and nothing else: that is said once, and the run goes on without.
"""

from __future__ import annotations

import hashlib
import json
import logging
import os
import platform
import tempfile
from functools import cache
from pathlib import Path

import platformdirs

log = logging.getLogger(__name__)

Wisdom = tuple[bytes, ...]


def folder() -> Path:
    """The cache folder: `WAVEJOB_CACHE`, else the platform's user cache."""
    named = os.environ.get("WAVEJOB_CACHE")
    return Path(named) if named else Path(platformdirs.user_cache_dir("wavejob"))


@cache
def processor() -> str:
    """The model of the processor; wisdom of one is poor advice on another."""
    try:
        lines = Path("/proc/cpuinfo").read_text(encoding="utf-8", errors="replace").splitlines()
    except OSError:
        lines = []
    models = (line.partition(":")[2].strip() for line in lines if line.startswith("model name"))
    return next(models, "") or platform.processor() or platform.machine()


def load(where: Path, key: str) -> Wisdom | None:
    """The wisdom stored for `key`, or None."""
    path = _path(where, key)
    try:
        stored = json.loads(path.read_text(encoding="utf-8"))
        if stored["key"] != key:
            return None
        return tuple(str(text).encode() for text in stored["wisdom"])
    except (FileNotFoundError, NotADirectoryError):
        return None
    except (OSError, ValueError, KeyError, TypeError) as error:
        _say_once(f"cannot read {path} ({error}); planning anew")
        return None


def save(where: Path, key: str, wisdom: Wisdom) -> None:
    """Store `wisdom` for `key`, all or nothing."""
    path = _path(where, key)
    text = json.dumps({"key": key, "wisdom": [part.decode() for part in wisdom]}, indent=1)
    try:
        where.mkdir(parents=True, exist_ok=True)
        handle, name = tempfile.mkstemp(dir=where, prefix=path.name, suffix=".partial")
        with os.fdopen(handle, "w", encoding="utf-8") as file:
            file.write(text)
        os.replace(name, path)
    except OSError as error:
        _say_once(f"cannot write to the cache folder {where} ({error}); going on without it")


def _path(where: Path, key: str) -> Path:
    return where / f"fftw-{hashlib.sha256(key.encode()).hexdigest()[:16]}.json"


@cache
def _say_once(message: str) -> None:
    log.warning(message)
