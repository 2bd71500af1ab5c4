"""Residues of sphere integrals at the poles of a collision divisor.

Near the divisor of a cluster S the integrand is ``q^(A-1) conj(q)^(B-1)`` times regular functions, ``A = X_S +
(integer)`` and B likewise, with simple poles in X_S where both are non-positive integers.  The residue is
taken by Cauchy's formula on a circle in kinematic space around the pole, each point through the bilinear of disk
integrals: exact up to an aliasing error that is part of the bound.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

from ..channels import pair_order, read_labels
from ..dispatch.circle import choose_circle, laurent
from ..dispatch.request import Request, make_request
from ..dispatch.shifts import pair_shift
from ..errors import InputError
from ..estimate import Estimate, judge
from ..exact import ONE, Exact, read_integer
from ..integrals import SphereTerm
from ..kinematics import Mandelstams
from . import klt
from .evaluate import sphere_terms


def residue(
    kin: Mandelstams,
    f: Any,
    g: Any,
    *,
    channel: Sequence[int],
    level: int = 0,
    rtol: Any = None,
    atol: Any = 0,
    digits: Any = None,
    max_points: Any = None,
) -> Estimate:
    """The residue of ``J(f|g)`` in ``X_S`` at the pole of level N of a cluster of labels.

    Parameters
    ----------
    kin
        The point; its X of the cluster is ignored.  The cluster is moved by ``s_ij`` and ``s_kl`` up and ``s_jk, s_li``
        down, i and j the first and last label of the cluster, k and l of the rest in ascending order.
    f, g
        Left and right integrand.
    channel
        2 to n-2 labels.
    level
        N >= 0; 0 is the first pole that any term has.

    Raises
    ------
    InputError
        For labels or levels that are not allowed.
    PoleError
        When another divisor is on a pole there.
    """
    request = make_request(rtol=rtol, atol=atol, digits=digits, max_points=max_points)
    n, terms = sphere_terms(kin, f, g)
    cluster = tuple(sorted(read_labels(channel, n, "channel")))
    if not 2 <= len(cluster) <= n - 2:
        raise InputError("channel", repr(cluster), f"2 to {n - 2} labels")
    height = read_integer(level, "level", "an integer, at least 0")
    if height < 0:
        raise InputError("level", height, "an integer, at least 0")
    order = (*cluster, *(label for label in range(1, n + 1) if label not in cluster))
    chord = (1, len(cluster))
    inside = set(cluster)
    x = kin.channel(cluster)
    offsets = [_offset(n, term, inside) for term in terms]
    target = -min(offsets) - height
    unit = _by_labels(n, order, pair_shift(n, {chord: ONE}))
    away = target - x
    moved = [_shifted(term, unit, away) for term in terms]
    places = []
    for term in moved:
        for members, a, b in klt.divisors(n, term):
            slope = sum((v for v, pair in zip(unit, pair_order(n), strict=True) if set(pair) <= set(members)), 0 * ONE)
            for y in (a, b):
                places += _distances(y, slope)
    circle = choose_circle(places, 15.0 if request.digits is None else request.digits + 2.0, 1)
    real = all(t.coefficient.is_real and all(p.is_real for p in t.pairs) for t in moved)
    inner = _inner(request)
    found = laurent(
        lambda h: klt.integrate_terms(n, [_shifted(term, unit, h) for term in moved], inner),
        circle,
        -1,
        -1,
        real,
        request.digits or 15,
    )
    value, error = found.coefficient(-1)
    if request.digits is None:
        value = float(value.real) if real else complex(value)
    status = judge(complex(value), error, request.rtol, request.atol, error)
    details = {"choice": "coefficient -1 on a circle in kinematic space", "points": circle.count}
    return Estimate(
        value, error, status, "residue", found.evaluations, request.rtol, request.atol, request.digits, details
    )


def _inner(request: Request) -> Request:
    if request.digits is not None:
        return replace(request, digits=request.digits + 3, method="klt")
    return replace(request, rtol=max(0.1 * request.rtol, 1e-13), atol=0.1 * request.atol, method="klt")


def _offset(n: int, term: SphereTerm, inside: set[int]) -> int:
    """The larger of the integers ``A - X`` and ``B - X``: the term's first pole is where it is -X."""
    pairs = [k for k, pair in enumerate(pair_order(n)) if set(pair) <= inside]
    return max(sum(term.left[k] for k in pairs), sum(term.right[k] for k in pairs)) + len(inside) - 1


def _by_labels(n: int, order: Sequence[int], shift: tuple[Exact, ...]) -> tuple[Exact, ...]:
    table = {}
    for (i, j), h in zip(pair_order(n), shift, strict=True):
        a, b = order[i - 1], order[j - 1]
        table[min(a, b), max(a, b)] = h
    return tuple(table[pair] for pair in pair_order(n))


def _shifted(term: SphereTerm, unit: tuple[Exact, ...], h: Exact) -> SphereTerm:
    return klt.replace_pairs(term, tuple(p + h * v for p, v in zip(term.pairs, unit, strict=True)))


def _distances(y: Exact, slope: Exact) -> list[float]:
    if not slope:
        return []
    nearest = max(0, round(-y.re))
    levels = range(max(0, nearest - 2), nearest + 3)
    return [abs(((y + level) / slope).value()) for level in levels]
