r"""Sphere integrals from disk integrals: the bilinear of Kawai, Lewellen and Tye.

    ``J = (-1)^(n-3) pi^-(n-3) sum_{sigma, gamma} L_sigma K[sigma|gamma] R_gamma``,

sigma, gamma over the permutations of 2..n-2; L_sigma the disk integral of the left exponents over
``0 = z_1 < z_sigma1 < ... < z_{n-1} = 1``, R_gamma that of the right exponents over ``z_gamma1 < ... < z_1 = 0``, signs
of integer powers included, and

    ``K = prod_t sin pi (s_{1 sigma_t} + sum_{q<t} theta s_{sigma_q sigma_t})``,

theta = 1 if sigma_q stands to the right of sigma_t in gamma.  The kernel knows s only.  Which puncture is at 0, 1 and
infinity is the *frame*; the value does not depend on it, but single disk integrals may sit on a pole of their own, then
another frame is taken, and a mean over a circle in kinematic space if all fail.

Source: Kawai, Lewellen and Tye 1986; this arrangement of the kernel derived by contour deformation, checked against the
complex beta and Selberg integrals with spins.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from itertools import combinations, permutations
from typing import Any

from ..channels import pair_index, pair_order
from ..dispatch.engines import evaluate
from ..dispatch.request import Request
from ..errors import NotAvailableError, PoleError
from ..estimate import Estimate, judge
from ..exact import ONE, ZERO, Exact
from ..integrals import DiskTerm, SphereTerm
from ..momentum_kernel import sine_of

MAX_LEGS = 8
CIRCLE = 24
EPSILON = 2.0**-52


@dataclass(frozen=True)
class _Number:
    value: Any
    error: float


def integrate_terms(n: int, terms: Sequence[SphereTerm], request: Request) -> Estimate:
    """Value of ``sum_k c_k J(s, left, right)`` through disk integrals.

    Raises
    ------
    NotAvailableError
        For n > 8.
    PoleError
        When a term has a pole on a divisor; ``channel`` is the cluster.
    """
    if n > MAX_LEGS:
        raise NotAvailableError(f"method 'klt' goes up to n = {MAX_LEGS}")
    for term in terms:
        refuse_poles(n, term)
    real = all(t.coefficient.is_real and all(p.is_real for p in t.pairs) for t in terms)
    inner = _inner(request)
    count = 0
    found = _total(n, terms, inner)
    count += found[2]
    for _ in range(2):
        value, error = found[0], found[1]
        target = max(request.atol, request.rtol * float(abs(value)))
        if error <= target or not math.isfinite(error):
            break
        short = math.log10(error / target) if target > 0 else 8.0
        digits = int((inner.digits or 15) + max(short, 3.0) + 4)
        inner = replace(inner, digits=digits, rtol=10.0**-digits)
        found = _total(n, terms, inner)
        count += found[2]
    value, error, _ = found
    if request.digits is None:
        value = complex(value).real if real else complex(value)
        error += EPSILON * abs(value)
    status = judge(complex(value), error, request.rtol, request.atol, error)
    details = {"choice": "bilinear of disk integrals", "terms": len(terms), "disk digits": inner.digits or "double"}
    return Estimate(value, error, status, "klt", count, request.rtol, request.atol, request.digits, details)


def _inner(request: Request) -> Request:
    if request.digits is not None:
        digits = request.digits + 8
        return replace(request, digits=digits, rtol=10.0**-digits, atol=0.0, method="auto")
    return replace(request, rtol=1e-12, atol=0.0, method="auto")


def refuse_poles(n: int, term: SphereTerm) -> None:
    """Raise for a cluster at which the sphere integral itself has a pole: both exponents non-positive integers."""
    for cluster, a, b in divisors(n, term):
        if a.is_integer and b.is_integer and a <= 0 and b <= 0:
            raise PoleError(cluster, -max(int(a), int(b)), a, _message(cluster, a, b))


def _message(cluster: tuple[int, ...], a: Exact, b: Exact) -> str:
    name = ".".join(map(str, cluster))
    return (
        f"pole where {name} collide (exponents {a} and {b} of the divisor): the value does not exist here; "
        "ask for the residue, or move the point"
    )


def divisors(n: int, term: SphereTerm) -> list[tuple[tuple[int, ...], Exact, Exact]]:
    """Every cluster without n with ``sum a_ij + |S| - 1`` and the same for b."""
    index = pair_index(n)
    found = []
    for size in range(2, n - 1):
        for cluster in combinations(range(1, n), size):
            s = sum((term.pairs[index[pair]] for pair in combinations(cluster, 2)), ZERO)
            left = sum(term.left[index[pair]] for pair in combinations(cluster, 2))
            right = sum(term.right[index[pair]] for pair in combinations(cluster, 2))
            found.append((cluster, s + left + size - 1, s + right + size - 1))
    return found


def _total(n: int, terms: Sequence[SphereTerm], request: Request) -> tuple[Any, float, int]:
    sine = sine_of(request.digits)
    value: Any = sine.zero
    error, count = 0.0, 0
    for term in terms:
        number, spent = _one(n, term, request)
        factor = sine.number(term.coefficient)
        value = value + factor * sine.number(number.value)
        error += float(abs(factor)) * number.error
        count += spent
    return sine.handed_out(value), error, count


def frames(n: int) -> list[tuple[int, ...]]:
    """Relabellings to try: which labels take the places 1, n-1 and n; the first is the plain one."""
    labels = list(range(1, n + 1))
    plain = tuple(labels)
    found = [plain]
    for a, b, c in permutations(labels, 3):
        rest = [label for label in labels if label not in (a, b, c)]
        found.append((a, *rest, b, c))
    return list(dict.fromkeys(found))[:: max(1, len(found) // 8)]


def _one(n: int, term: SphereTerm, request: Request) -> tuple[_Number, int]:
    for frame in frames(n):
        try:
            return in_frame(n, term, frame, request)
        except PoleError:
            continue  # a pole of single disk integrals, not of the sphere integral: that was looked for before
    return _mean(n, term, request)


def _mean(n: int, term: SphereTerm, request: Request) -> tuple[_Number, int]:
    """The mean over a circle of massless shifts of s, for points where every frame meets poles of single terms."""
    direction = _direction(n)
    sine = sine_of(request.digits)
    room = 1.0
    for _, a, b in divisors(n, term):
        for y in (a, b):
            nearest = max(0, round(-y.re))
            for level in (nearest - 1, nearest, nearest + 1):
                distance = abs((y + level).value())
                if level >= 0 and distance > 0:
                    room = min(room, distance)
    radius = 0.3 * min(room, 1.0) / max(abs(v.value()) * n for v in direction)
    total: Any = sine.zero
    error, count, largest = 0.0, 0, 0.0
    for k in range(CIRCLE):
        angle = 2.0 * math.pi * (k + 0.5) / CIRCLE
        h = Exact(Fraction(radius * math.cos(angle)), Fraction(radius * math.sin(angle)))
        moved = replace_pairs(term, tuple(p + h * v for p, v in zip(term.pairs, direction, strict=True)))
        number, spent = in_frame(n, moved, tuple(range(1, n + 1)), request)
        total = total + sine.number(number.value)
        error += number.error
        count += spent
        largest = max(largest, float(abs(number.value)))
    return _Number(sine.handed_out(total / CIRCLE), error / CIRCLE + 10.0 * largest * 0.3**CIRCLE), count


def replace_pairs(term: SphereTerm, pairs: tuple[Exact, ...]) -> SphereTerm:
    """The term with other s."""
    return SphereTerm(term.coefficient, pairs, term.left, term.right)


def _direction(n: int) -> tuple[Exact, ...]:
    from ..dispatch.shifts import chords_of, pair_shift

    return pair_shift(n, {c: Exact(Fraction(30 + (89 * k + 37) % 70, 100)) for k, c in enumerate(chords_of(n))})


def in_frame(n: int, term: SphereTerm, frame: Sequence[int], request: Request) -> tuple[_Number, int]:
    """The bilinear with ``frame[k-1]`` in the place of label k: 1 at 0, n-1 at 1, n at infinity.

    Returns
    -------
    (number, evaluations)
    """
    s, left, right, sign = _relabelled(n, term, frame)
    inner = list(range(2, n - 1))
    words = list(permutations(inner))
    sine = sine_of(request.digits)
    count = 0

    def disks(
        powers: dict[tuple[int, int], int], order_of: Callable[[tuple[int, ...]], tuple[int, ...]]
    ) -> list[_Number]:
        nonlocal count
        found = []
        for word in words:
            order = order_of(word)
            estimate = evaluate(n, [_disk_term(n, s, powers, order)], request)
            count += estimate.evaluations
            found.append(_Number(sine.number(estimate.value), estimate.error))
        return found

    _look_for_poles(n, s, left, [(1, *word, n - 1, n) for word in words])
    _look_for_poles(n, s, right, [(*word, 1, n - 1, n) for word in words])
    lefts = disks(left, lambda word: (1, *word, n - 1, n))
    rights = disks(right, lambda word: (*word, 1, n - 1, n))
    value: Any = sine.zero
    error, moduli = 0.0, 0.0
    for sigma, one in zip(words, lefts, strict=True):
        row: Any = sine.zero
        row_error, row_moduli = 0.0, 0.0
        for gamma, other in zip(words, rights, strict=True):
            k = _kernel(sine, s, sigma, gamma)
            size = float(abs(k))
            row = row + k * other.value
            row_error += size * other.error
            row_moduli += size * float(abs(other.value))
        value = value + one.value * row
        error += float(abs(one.value)) * row_error + one.error * (row_moduli + row_error)
        moduli += float(abs(one.value)) * row_moduli
    scale = (-1 / (math.pi if sine.ctx is None else +sine.ctx.pi)) ** (n - 3)
    unit = EPSILON if request.digits is None else 10.0 ** -min(request.digits + 5, 300)
    error += unit * (4 + 3 * n + len(words)) * moduli
    return _Number(sine.handed_out(sign * scale * value), error * abs(float(scale))), count


Powers = dict[tuple[int, int], int]


def _relabelled(
    n: int, term: SphereTerm, frame: Sequence[int]
) -> tuple[dict[tuple[int, int], Exact], Powers, Powers, int]:
    """s and powers by places, and the sign from writing every z_ij with the smaller place first."""
    index = pair_index(n)
    s, left, right = {}, {}, {}
    sign = 1
    for i, j in pair_order(n):
        a, b = frame[i - 1], frame[j - 1]
        k = index[a, b]
        s[i, j] = s[j, i] = term.pairs[k]
        left[i, j], right[i, j] = term.left[k], term.right[k]
        if a > b and (term.left[k] + term.right[k]) % 2:
            sign = -sign
    return s, left, right, sign


def _disk_term(n: int, s: dict[tuple[int, int], Exact], powers: Powers, order: tuple[int, ...]) -> DiskTerm:
    """The integral of ``prod |z_ij|^(s+p) sgn(z_ij)^p`` over ``z_order1 < z_order2 < ...``."""
    place = {label: k for k, label in enumerate(order)}
    negative = False
    pairs = []
    for i, j in pair_order(n):
        a, b = order[i - 1], order[j - 1]
        low, high = min(a, b), max(a, b)
        power = powers[low, high]
        pairs.append(s[low, high] + power)
        negative ^= place[low] < place[high] and power % 2 == 1
    return DiskTerm(-ONE if negative else ONE, tuple(pairs))


def _look_for_poles(n: int, s: dict[tuple[int, int], Exact], powers: Powers, orders: Sequence[tuple[int, ...]]) -> None:
    """Poles of the disk integrals, before any is computed."""
    known: dict[frozenset[int], Exact] = {}
    for order in orders:
        for i in range(n - 2):
            for j in range(i + 1, n - 1):
                if (i, j) == (0, n - 2):
                    continue
                cluster = frozenset(order[i : j + 1])
                if cluster not in known:
                    members = sorted(cluster)
                    total = sum((s[p] + powers[p] for p in combinations(members, 2)), ZERO)
                    known[cluster] = total + len(members) - 1
                y = known[cluster]
                if y.is_integer and y <= 0:
                    raise PoleError(tuple(sorted(cluster)), -int(y), y)


def _kernel(sine: Any, s: dict[tuple[int, int], Exact], sigma: Sequence[int], gamma: Sequence[int]) -> Any:
    place = {label: k for k, label in enumerate(gamma)}
    product = sine.one
    for t, here in enumerate(sigma):
        x = s[1, here]
        for before in sigma[:t]:
            if place[before] > place[here]:
                x = x + s[before, here]
        product = product * sine.sin(x)
    return product
