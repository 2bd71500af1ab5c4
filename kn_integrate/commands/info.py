"""``kn-integrate info``: versions and machine, or what a job would do."""

from __future__ import annotations

import os
import platform
from pathlib import Path
from typing import Any

from ..errors import InputError, NotAvailableError
from ..jobs import INTEGRAND, ORDERING, Field, Job, integrand_of, job_of_file, point_of, read_file
from ..report.outcome import Outcome, outcome_of_facts
from ..report.plain import plain
from ._verb import FORMAT, Verb, format_option, job_argument, show, single


def _about() -> Outcome:
    from ..report.versions import versions

    cpu = {"model": _cpu_model(), "cores": _usable_cores(), "system": platform.platform()}
    facts = outcome_of_facts({"cache": cache_folder(), "cpu": cpu})
    return Outcome((*versions().items(), *facts.rows), facts.document)  # the document has the versions anyway


def cache_folder() -> str:
    """Where compiled kernels are kept: NUMBA_CACHE_DIR, else beside the kernels, else numba's own user folder."""
    chosen = os.environ.get("NUMBA_CACHE_DIR")
    if chosen:
        return chosen
    beside = Path(__file__).resolve().parent.parent / "kernels" / "__pycache__"
    holder = beside if beside.exists() else beside.parent
    if os.access(holder, os.W_OK):
        return str(beside)
    return "numba's user cache (the installation is read-only); set NUMBA_CACHE_DIR to choose a folder"


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
    """What a job asks for, and what the engine would do about it."""
    from .. import api

    predict = getattr(api, "predict", None)
    if predict is None:
        raise NotAvailableError("info JOB: this version cannot predict the work of a job")
    point, integrand = point_of(job), integrand_of(job)
    rtol: Any = job.table("accuracy").get("rtol")
    facts: dict[str, Any] = {"verb": job.verb, "integral": job.get(INTEGRAND) or "absolute-value exponents"}
    return outcome_of_facts({**facts, **predict(point, integrand, ordering=job.get(ORDERING), rtol=rtol)})


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
    data = read_file(path)
    asked = job_of_file(path, data, _fields_of(path, data["verb"]))
    show("info", {"job": plain(asked.tables())}, output, lambda: _explain(asked))


command = Verb(
    "info",
    callback=_callback,
    help="Versions and machine; or what a job file asks for and would cost.",
    params=[job_argument(), format_option()],
)
