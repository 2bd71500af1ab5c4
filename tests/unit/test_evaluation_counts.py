"""What a fixed set of calls costs, counted in integrand evaluations and series terms: never in seconds.

More than a tenth above the recorded numbers is a failure.  After a change that is meant to cost (or to save), record
anew with ``KN_UPDATE_GOLDEN=1 python -m pytest tests/unit/test_evaluation_counts.py`` and read the difference.
"""

from __future__ import annotations

import json
import os
from functools import cache
from pathlib import Path

import pytest

import kn_integrate as kn
from kn_integrate.closed_forms import Selberg
from kn_integrate.exact import ONE, Exact
from kn_integrate.integrals import DiskTerm

GOLDEN = Path(__file__).parent.parent / "golden" / "evaluation_counts.json"
ROOM = 1.1


def selberg(n, rtol, **options):
    form = Selberg(n - 3, "0.37", "0.41", "0.23")
    exponents = kn.DiskExponents(n, tuple(form.pairs().flat))
    return kn.disk_integral(exponents, rtol=rtol, **options)


def deep(n, seed, rtol, **options):
    kin = kn.Mandelstams.random(n, seed, low="-23/10", high="6/5")
    return kn.disk_integral(kin, kn.parke_taylor(*range(1, n + 1)), rtol=rtol, **options)


def turning(n, rtol):
    """Complex invariants."""
    kin = kn.Mandelstams.random(n, 4, low="1/5", high=1)
    channels = {c: x + Exact(0, 1) * x / 2 for c, x in kin.planar().items()}
    moved = kn.Mandelstams.from_planar(n, channels)
    return kn.disk_integral(moved, kn.parke_taylor(*range(1, n + 1)), rtol=rtol, method="quadrature")


def sphere(n, rtol):
    kin = kn.Mandelstams.random(n, 2, low="1/5", high="1/2")
    f = kn.parke_taylor(*range(1, n + 1))
    return kn.sphere_integral(kin, f, f, method="direct", rtol=rtol)


def series_terms(n, low, high):
    """Lengths of the series of one integral, weighted with the entries of their matrices."""
    import kn_integrate.kz.series as series
    from kn_integrate.kz.integral import integrate_terms
    from kn_integrate.kz.pattern import entry_count

    kin = kn.Mandelstams.random(n, 3, low=low, high=high)
    (term,) = kn.DiskIntegral(n, kn.parke_taylor(*range(1, n + 1))).terms(kin)
    lengths = []
    plain = series.series_length
    series.series_length = lambda *given: lengths.append(plain(*given)) or lengths[-1]
    try:
        assert integrate_terms(n, [DiskTerm(ONE, term.pairs)], rtol=1e-9, escalate=False).ok
    finally:
        series.series_length = plain
    return sum(k * max(1, entry_count(m)) for m, k in enumerate(lengths))


def evaluations(result):
    assert result.ok, result
    return result.evaluations


CASES = {
    **{
        f"quadrature n={n} {rtol:g}": lambda n=n, rtol=rtol: evaluations(selberg(n, rtol, method="quadrature"))
        for n in (4, 5, 6, 7, 8)
        for rtol in (1e-8, 1e-12)
    },
    "quadrature n=5 deep 1e-9": lambda: evaluations(deep(5, 1, 1e-9, method="quadrature")),
    "quadrature n=6 deep 1e-8": lambda: evaluations(deep(6, 1, 1e-8, method="quadrature")),
    "quadrature n=5 complex 1e-9": lambda: evaluations(turning(5, 1e-9)),
    "quadrature n=6 complex 1e-9": lambda: evaluations(turning(6, 1e-9)),
    "contour n=5 1e-8": lambda: evaluations(selberg(5, 1e-8, method="quadrature", rule="contour")),
    **{
        f"series n={n} in ({low}, {high})": lambda n=n, low=low, high=high: series_terms(n, low, high)
        for n in (6, 7, 8, 9)
        for low, high in (("1/5", "1"), ("1/10", "2"))
    },
    "direct sphere n=4 1e-10": lambda: evaluations(sphere(4, 1e-10)),
    "direct sphere n=5 1e-6": lambda: evaluations(sphere(5, 1e-6)),
    "direct sphere n=5 1e-9": lambda: evaluations(sphere(5, 1e-9)),
}


@cache
def recorded():
    return json.loads(GOLDEN.read_text(encoding="utf-8"))


@pytest.mark.parametrize("name", CASES)
def test_no_more_than_recorded(name):
    count = CASES[name]()
    if os.environ.get("KN_UPDATE_GOLDEN"):
        known = json.loads(GOLDEN.read_text(encoding="utf-8")) if GOLDEN.exists() else {}
        known[name] = count
        ordered = {key: known[key] for key in CASES if key in known}
        GOLDEN.write_text(json.dumps(ordered, indent=1) + "\n", encoding="utf-8")
        return
    assert 0 < count <= ROOM * recorded()[name]


def test_every_case_is_recorded():
    assert list(recorded()) == list(CASES)
