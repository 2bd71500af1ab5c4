"""The machine a benchmark ran on, and the yardstick: vectorised numpy log and exp per element."""

from __future__ import annotations

import platform
import time
from pathlib import Path

import numpy as np


def machine() -> str:
    """Processor, system and versions in one line."""
    import numba
    import scipy

    model = platform.processor() or platform.machine()
    cpuinfo = Path("/proc/cpuinfo")
    if cpuinfo.exists():
        for line in cpuinfo.read_text(encoding="utf-8").splitlines():
            if line.startswith("model name"):
                model = line.partition(":")[2].strip()
                break
    versions = f"Python {platform.python_version()}, numpy {np.__version__}, scipy {scipy.__version__}"
    return f"{model}; {platform.system()}; {versions}, numba {numba.__version__}"


def best_of(function, repeat: int = 5, least: float = 0.02) -> float:
    """Shortest of several timings of a call, in seconds; quick calls are repeated within each timing."""
    function()
    start = time.perf_counter()
    function()
    once = time.perf_counter() - start
    loops = max(1, int(least / max(once, 1e-9)))
    times = []
    for _ in range(repeat):
        start = time.perf_counter()
        for _ in range(loops):
            function()
        times.append((time.perf_counter() - start) / loops)
    return min(times)


def yardstick() -> tuple[float, float]:
    """Seconds per element of numpy's log and exp on arrays that fit the cache."""
    x = np.linspace(1.0, 5.0, 4096)
    out = np.empty_like(x)
    log = best_of(lambda: np.log(x, out=out)) / len(x)
    exp = best_of(lambda: np.exp(x, out=out)) / len(x)
    return log, exp


def peak_memory() -> int:
    """Largest resident size of this process so far, in bytes (0 where the system does not tell)."""
    try:
        import resource
    except ImportError:
        return 0
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * 1024
