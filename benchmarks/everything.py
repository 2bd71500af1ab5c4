"""Every figure of the README in one command: runs the benchmarks one after another and says on what machine.

    python benchmarks/everything.py            all of it, about a quarter of an hour
    python benchmarks/everything.py --quick    without the parts that take more than a minute

Nothing else should run meanwhile; the load of the machine is printed with the figures, and every benchmark prints a
yardstick or a peer of its own run.
"""

from __future__ import annotations

import argparse
import os
import subprocess
import sys
import time
from pathlib import Path

from _machine import machine

FULL = [
    ["disk_speed.py", "--large"],
    ["kz_speed.py", "--large", "--digits"],
    ["depth_cost.py"],
    ["sphere_speed.py"],
    ["expansion_speed.py"],
    ["gradient_speed.py"],
    ["startup.py"],
]
QUICK = [["disk_speed.py"], ["kz_speed.py"], ["sphere_speed.py", "5"], ["expansion_speed.py"], ["startup.py"]]


def main() -> int:
    """Run them; 1 when one failed."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--quick", action="store_true")
    options = parser.parse_args()
    print(machine())
    folder = Path(__file__).parent
    failed = []
    for script, *arguments in QUICK if options.quick else FULL:
        load = f", load {os.getloadavg()[0]:.1f}" if hasattr(os, "getloadavg") else ""
        print(f"\n== python benchmarks/{' '.join([script, *arguments])}{load}\n", flush=True)
        start = time.perf_counter()
        done = subprocess.run([sys.executable, str(folder / script), *arguments], check=False)
        print(f"({time.perf_counter() - start:.0f} s)", flush=True)
        if done.returncode:
            failed.append(script)
    if failed:
        print(f"failed: {', '.join(failed)}", file=sys.stderr)
    return 1 if failed else 0


if __name__ == "__main__":
    sys.exit(main())
