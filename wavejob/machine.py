"""What this machine gives to a process: cores and memory, within affinity and control groups."""

from __future__ import annotations

import os
import platform
from collections.abc import Iterator
from pathlib import Path

CONTROL_GROUPS = Path("/sys/fs/cgroup")
OWN_GROUPS = Path("/proc/self/cgroup")
PROCESSOR = Path("/proc/cpuinfo")


def cores() -> int:
    """Cores this process may use, at least 1."""
    allowed = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1
    shares = [share for folder in _groups("cpu") for share in _core_limits(folder)]
    return min([allowed, *(max(int(share), 1) for share in shares)])


def memory() -> int:
    """Bytes of memory this process can have in all."""
    limits = [limit for folder in _groups("memory") for limit in _memory_limits(folder)]
    return min([_installed(), *limits])


def processor() -> str:
    """The model of the processor, as far as the system tells."""
    lines = _text(PROCESSOR).splitlines()
    models = (line.partition(":")[2].strip() for line in lines if line.startswith("model name"))
    return next(models, "") or platform.processor() or platform.machine()


def _installed() -> int:
    if hasattr(os, "sysconf") and "SC_PHYS_PAGES" in os.sysconf_names:
        return os.sysconf("SC_PHYS_PAGES") * os.sysconf("SC_PAGE_SIZE")
    import psutil  # here, because it is needed on one platform only

    return int(psutil.virtual_memory().total)


def _groups(controller: str) -> Iterator[Path]:
    """Folders of the control groups this process is in, and of those around them."""
    for line in _text(OWN_GROUPS).splitlines():
        _, names, path = line.split(":", 2)
        if names and controller not in names.split(","):
            continue
        root = CONTROL_GROUPS / controller if names else CONTROL_GROUPS
        own = root / path.lstrip("/")
        yield from (folder for folder in (own, *own.parents) if folder.is_relative_to(root))


def _memory_limits(folder: Path) -> Iterator[int]:
    """The limit of one group, under either name; a group without one says `max` or a huge number."""
    for name in ("memory.max", "memory.limit_in_bytes"):
        text = _text(folder / name).strip()
        if text.isdigit():
            yield int(text)


def _core_limits(folder: Path) -> Iterator[float]:
    """Cores' worth of time that one group may use: time and period, in one file or in two."""
    words = _text(folder / "cpu.max").split()
    if not words:
        words = [_text(folder / f"cpu.cfs_{name}_us").strip() for name in ("quota", "period")]
    quota, period = words
    if quota.isdigit() and period.isdigit() and int(period) > 0:
        yield int(quota) / int(period)


def _text(path: Path) -> str:
    try:
        return path.read_text(encoding="utf-8", errors="replace")
    except OSError:
        return ""
