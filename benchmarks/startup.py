"""What starting costs: help, imports, the first integral with nothing compiled and with everything compiled.

    python benchmarks/startup.py

Every figure is the shortest of several fresh processes; the peer is the interpreter doing nothing, in the same run.
"Cold" has an empty folder for compiled kernels (``NUMBA_CACHE_DIR``), as after an installation; "warm" the same folder
again.  A read-only installation keeps its kernels in the user's cache folder, or below the temporary folder when that
cannot be written to either, and is then as warm as any other.
"""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
import time

from _machine import machine

INTEGRAL = """
import kn_integrate as kn
kin = kn.Mandelstams.from_planar(5, {(1,2): "3/10", (2,3): "2/5", (3,4): "1/2", (4,5): "7/20", (5,1): "9/20"})
assert kn.disk_integral(kin, kn.parke_taylor(1, 2, 3, 4, 5), METHOD).ok
"""


def seconds(arguments: list[str], repeat: int, folder: str | None = None) -> float:
    """The shortest of several fresh processes."""
    environment = dict(os.environ)
    if folder is not None:
        environment["NUMBA_CACHE_DIR"] = folder
    best = float("inf")
    for _ in range(repeat):
        start = time.perf_counter()
        subprocess.run([sys.executable, *arguments], check=True, env=environment, stdout=subprocess.DEVNULL)
        best = min(best, time.perf_counter() - start)
    return best


def main() -> None:
    """Print the table."""
    print(machine())
    nothing = seconds(["-c", "pass"], 15)
    rows = [("the interpreter alone", nothing)]
    rows.append(("kn-integrate --help", seconds(["-m", "kn_integrate.cli", "--help"], 15)))
    rows.append(("import kn_integrate", seconds(["-c", "import kn_integrate"], 15)))
    for name, method in (("five points", "method='quadrature'"), ("five points, series", "method='kz'")):
        with tempfile.TemporaryDirectory() as folder:
            code = ["-c", INTEGRAL.replace("METHOD", method)]
            rows.append((f"first integral, {name}, cold", seconds(code, 1, folder)))
            rows.append((f"first integral, {name}, warm", seconds(code, 7, folder)))
    print(f"\n{'':40s}{'seconds':>9s}{'beyond the interpreter':>25s}")
    for name, value in rows:
        print(f"{name:40s}{value:9.3f}{value - nothing:25.3f}")


if __name__ == "__main__":
    main()
