"""``kn-integrate info``: versions and machine, or what a job would do."""

from __future__ import annotations

import os
import platform
from pathlib import Path
from typing import Any

from ..errors import InputError
from ..jobs import EXPONENTS, INTEGRAND, Field, Job, job_of_file, read_file
from ..report.outcome import Outcome, outcome_of_facts
from ..report.plain import plain
from ._explain import explain_point
from ._verb import FORMAT, Verb, format_option, job_argument, show, single


def _about() -> Outcome:
    from ..report.versions import versions

    cpu = {"model": _cpu_model(), "cores": _usable_cores(), "system": platform.platform()}
    facts = outcome_of_facts({"cache": cache_folder(), "cpu": cpu})
    return Outcome((*versions().items(), *facts.rows), facts.document)  # the document has the versions anyway


def cache_folder() -> str:
    """Where compiled kernels are kept: NUMBA_CACHE_DIR, else the first of several folders that can be written to."""
    from ..kernels.cache import place

    return place()


def _cpu_model() -> str:
    try:
        for line in Path("/proc/cpuinfo").read_text(encoding="utf-8").splitlines():
            if line.startswith("model name"):
                return line.partition(":")[2].strip()
    except OSError:
        pass  # not Linux
    return platform.processor() or platform.machine()


def _usable_cores() -> int:
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def _explain(job: Job) -> Outcome:
    """What a job asks for, and what the engines would do about it."""
    from . import load_verb

    facts: dict[str, Any] = {"verb": job.verb}
    if job.get(INTEGRAND) is not None:
        facts["integral"] = job.get(INTEGRAND)
    elif job.get(EXPONENTS) is not None:
        facts["integral"] = "absolute-value exponents"
    explain = load_verb(job.verb).explain
    return outcome_of_facts({**facts, **(explain_point(job) if explain is None else explain(job))})


def _store_facts(path: str) -> Outcome:
    """What the store of a scan holds."""
    from ..scans import open_scan

    scan = open_scan(path)
    integral, options = scan.task["integral"], scan.task["options"]
    seconds = sum(row.seconds for row in scan)
    facts: dict[str, Any] = {
        "store": path,
        "integral": integral,
        "options": options,
        "points": scan.total,
        "finished": len(scan),
        "status": scan.counts,
        "seconds in integrals": f"{seconds:.3g}",
    }
    if scan.rows and not scan.complete:
        facts["seconds to go on one core"] = f"{seconds / len(scan) * (scan.total - len(scan)):.3g}"
    return outcome_of_facts(facts)


def _fields_of(path: str, name: str) -> tuple[Field, ...]:
    from . import load_verb, verb_names

    verbs = [known for known in verb_names() if known != "info"]
    if name not in verbs:
        raise InputError(f"{path}: verb", repr(name), "one of " + ", ".join(verbs))
    return load_verb(name).fields


def _callback(job: tuple[str, ...], format: tuple[str, ...]) -> None:
    output = FORMAT(single("--format", format) or "table", "--format")
    path = single("JOB", job)
    if path is None:
        show("info", {}, output, _about)
        return
    if _is_store(path):
        show("info", {}, output, lambda: _store_facts(path))
        return
    data = read_file(path)
    asked = job_of_file(path, data, _fields_of(path, data["verb"]))
    show("info", {"job": plain(asked.tables())}, output, lambda: _explain(asked))


def _is_store(path: str) -> bool:
    try:
        with open(path, "rb") as file:
            return file.read(16) == b"SQLite format 3\0"
    except OSError:
        return False  # what is wrong with it is said where it is read


command = Verb(
    "info",
    callback=_callback,
    help="Versions and machine; or what a job file asks for and would cost; or what the store of a scan holds.",
    params=[job_argument(), format_option()],
)
