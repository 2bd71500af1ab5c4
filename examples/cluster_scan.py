"""A scan on a Dask cluster: the same bits as on one core.

Needs the extra ``dask`` (``pip install 'kn-integrate[dask]'``).  The cluster here is two processes on this machine; a
real one differs in one line: ``Client("tcp://scheduler:8786")``.  Only this process writes to the store, so the workers
need no common file system, and a worker that dies costs the points it was at: Dask gives them to another one.

    python examples/cluster_scan.py
"""

from __future__ import annotations

import tempfile
from pathlib import Path

from distributed import Client, LocalCluster

import kn_integrate as kn


def main() -> None:
    points = kn.ScanPoints.grid(
        5,
        {(1, 2): kn.spaced("1/10", "9/10", 6), (3, 4): kn.spaced("-1/2", "1/2", 5)},
        {(2, 3): "2/5", (4, 5): "7/20", (1, 5): "9/20"},
    )
    with tempfile.TemporaryDirectory() as folder:
        here = kn.scan(points, "PT(1,2,3,4,5)", store=Path(folder) / "here.sqlite", progress="none")
        with (
            LocalCluster(n_workers=2, threads_per_worker=1, dashboard_address=None) as cluster,
            Client(cluster) as client,
            client.get_executor() as executor,
        ):
            store = Path(folder) / "cluster.sqlite"
            there = kn.scan(points, "PT(1,2,3,4,5)", store=store, executor=executor, progress="none")
    print(f"serial:  {len(here)} points, {here.counts}")
    print(f"cluster: {len(there)} points, {there.counts}")
    same = [(row.real, row.error_text, row.status) for row in here] == [
        (row.real, row.error_text, row.status) for row in there
    ]
    print(f"the same bits: {same}")
    assert same


if __name__ == "__main__":
    main()
