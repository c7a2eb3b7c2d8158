"""What this machine lets us use: cores and memory, with the limits of containers and batch systems honoured.

Cores come from the scheduler's affinity mask and SLURM's grant; memory from the physical total, the control
group and SLURM.
"""

from __future__ import annotations

import os
from pathlib import Path

CGROUP_LIMITS = ("/sys/fs/cgroup/memory.max", "/sys/fs/cgroup/memory/memory.limit_in_bytes")


def core_count() -> int:
    """Cores that this process may use, at least 1."""
    available = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1
    granted = os.environ.get("SLURM_CPUS_PER_TASK", "")
    return max(1, min(available, int(granted)) if granted.isdigit() else available)


def memory_limit() -> int:
    """Bytes of memory that this process may use."""
    limits = [os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_PHYS_PAGES")]
    for name in CGROUP_LIMITS:
        try:
            text = Path(name).read_text(encoding="ascii").strip()
        except OSError:
            continue
        if text.isdigit():
            limits.append(int(text))
    granted = os.environ.get("SLURM_MEM_PER_NODE", "")
    if granted.isdigit() and int(granted) > 0:
        limits.append(int(granted) * 2**20)
    return min(limits)
