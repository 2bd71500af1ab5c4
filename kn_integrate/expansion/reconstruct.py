"""Coefficients as functions of the invariants, from their values at exact points.

The coefficient of a product of zeta values of weight w is a rational function of the planar invariants, homogeneous of
degree ``w + leading order``, with simple poles in channels that are known from the integrand.  Times these channels it
is a polynomial with unknown rational coefficients: as many exact values as there are monomials determine it, and
further values, not used for that, check both the polynomial and the claim about the poles.
"""

from __future__ import annotations

import random
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations_with_replacement
from math import comb
from typing import Any

from ..channels import Channel, planar_channels
from ..errors import InputError, KNError, WorkLimitError
from ..exact import ONE, ZERO, Exact, read_integer
from ..integrals import DiskIntegral, SphereIntegral
from ..integrand import Integrand
from ..kinematics import Mandelstams
from .chains import chains
from .disk import in_standard_order
from .specs import FEntry, Spec, leading_order, read_spec, series_of
from .zetas import Product, ZetaSum, latex_number, product_weight, read_weight

MAX_MONOMIALS = 1500
_RANGE = 12  # points have integer invariants up to this


@dataclass(frozen=True)
class CoefficientFunction:
    """The coefficient of one product of zeta values as a function of the planar invariants.

    Attributes
    ----------
    zeta : ZetaSum
        The product.
    channels : tuple of channels
        The variables: planar invariants ``X``, each by all its labels.
    numerator : Mapping
        Exponents of the variables -> rational coefficient; homogeneous.
    denominator : tuple of channels
        The channels whose invariants are divided by, each once.
    points, checks : int
        Exact values that determined the polynomial, and further ones that it was found to give.
    """

    zeta: ZetaSum
    channels: tuple[Channel, ...]
    numerator: Mapping[tuple[int, ...], Exact]
    denominator: tuple[Channel, ...]
    points: int
    checks: int

    def __call__(self, kin: Mandelstams) -> Exact:
        """The value at a kinematic point.

        Raises
        ------
        ZeroDivisionError
            On a pole.
        """
        values = [kin.channel(channel) for channel in self.channels]
        total = ZERO
        for exponents, c in self.numerator.items():
            total = total + c * _monomial(values, exponents)
        for channel in self.denominator:
            total = total / kin.channel(channel)
        return total

    def __str__(self) -> str:
        top = _text(self, str, "*", "^{}") or "0"
        if not self.denominator:
            return top
        bottom = "*".join(_name(channel) for channel in self.denominator)
        return f"({top})/({bottom})" if len(self.denominator) > 1 else f"({top})/{bottom}"

    def latex(self) -> str:
        r"""LaTeX, with ``s_{12}`` for the invariant of the channel (1, 2)."""
        top = _text(self, latex_number, " ", "^{{{}}}", latex=True) or "0"
        if not self.denominator:
            return top
        return rf"\frac{{{top}}}{{{' '.join(_name(c, latex=True) for c in self.denominator)}}}"

    def to_dict(self) -> dict[str, Any]:
        """Plain data."""
        return {
            "zeta": str(self.zeta),
            "channels": [list(channel) for channel in self.channels],
            "numerator": [[list(exponents), str(c)] for exponents, c in self.numerator.items()],
            "denominator": [list(channel) for channel in self.denominator],
            "points": self.points,
            "checks": self.checks,
        }


def reconstruct(
    f: Integrand | DiskIntegral | SphereIntegral | FEntry | str,
    g: Integrand | str | None = None,
    *,
    zeta: ZetaSum | int,
    n: int | None = None,
    ordering: Sequence[int] | None = None,
    checks: int = 4,
) -> CoefficientFunction:
    """The coefficient of a product of zeta values, as a function of the planar invariants.

    Parameters
    ----------
    f, g, ordering
        The integral, as for :func:`alpha_expansion`.
    zeta
        One product of generators of the basis, such as ``kn.zeta(3)`` or ``kn.zeta(2) * kn.zeta(3)``; 1 for weight 0,
        the field-theory limit.
    n
        Number of legs; not needed with an integral.
    checks
        Further exact values to compare with.

    Raises
    ------
    InputError
        For a zeta value that is not one product of generators, integrands with complex coefficients.
    WorkLimitError
        When the polynomial has too many monomials.
    KNError
        When a check fails.

    Examples
    --------
    >>> import kn_integrate as kn
    >>> print(reconstruct(kn.FEntry(5, (2, 3), (2, 3)), zeta=kn.zeta(2)))
    s12*s34 - s12*s15 - s34*s45
    """
    product, weight = _read_product(zeta)
    points = f.n if isinstance(f, (DiskIntegral, SphereIntegral, FEntry)) else n
    if points is None:
        raise InputError("n", "None", "the number of legs, beside an integrand")
    spec = read_spec(points, f, g, ordering)
    if not all(term.coefficient.is_real for each in _integrands(spec) for term in each.terms):
        raise InputError("f", "complex coefficients", "real ones")
    extra = read_integer(checks, "checks", "a number of checks from 1 to 100")
    if not 1 <= extra <= 100:
        raise InputError("checks", str(checks), "a number of checks from 1 to 100")
    variables = planar_channels(spec.ordering if isinstance(spec, DiskIntegral) else tuple(range(1, points + 1)))
    poles = _pole_channels(spec, variables)
    degree = weight + leading_order(spec) + len(poles)
    exponents = _exponents(len(variables), degree)
    if comb(degree + len(variables) - 1, degree) > MAX_MONOMIALS:
        count = comb(degree + len(variables) - 1, degree)
        raise WorkLimitError(count, MAX_MONOMIALS, "monomials", "ask for entries of F, which have no poles")
    rng = random.Random(f"{spec.to_dict()} {product}")
    used: list[list[Exact]] = []
    values: list[Exact] = []
    numerator = None
    spare = 0
    while numerator is None:
        while len(used) < len(exponents) + spare:
            at, value = _sample(spec, points, variables, poles, product, weight, rng)
            used.append(at)
            values.append(value)
        numerator = _solve(used, values, exponents)
        spare += 4  # the points may have been in special position
    result = CoefficientFunction(
        ZetaSum([(product, ONE)]), variables, *_lowest(numerator, variables, poles), len(used), extra
    )
    for _ in range(extra):
        at, value = _sample(spec, points, variables, (), product, weight, rng)
        kin = Mandelstams.from_planar(points, dict(zip(variables, at, strict=True)), _ordering(spec))
        if result(kin) != value:
            raise KNError("the reconstructed coefficient fails at a check point; please report this integral")
    return result


def _read_product(value: Any) -> tuple[Product, int]:
    if isinstance(value, int) and not isinstance(value, bool) and value == 1:
        return (), 0
    if not isinstance(value, ZetaSum) or len(value.terms) != 1 or value.terms[0][1] != 1:
        raise InputError("zeta", str(value), "one product of generators, such as zeta(3) or zeta(2)*zeta(3); or 1")
    product = value.terms[0][0]
    return product, read_weight(product_weight(product))


def _integrands(spec: Spec) -> tuple[Integrand, ...]:
    if isinstance(spec, DiskIntegral):
        return (spec.f,)
    return (spec.f, spec.g) if isinstance(spec, SphereIntegral) else ()


def _ordering(spec: Spec) -> Channel:
    return spec.ordering if isinstance(spec, DiskIntegral) else tuple(range(1, spec.n + 1))


def _pole_channels(spec: Spec, variables: Sequence[Channel]) -> tuple[Channel, ...]:
    """Channels that may be poles: neighbours in some Parke-Taylor factor, and on the disk planar in its ordering."""
    if isinstance(spec, FEntry):
        return ()
    if isinstance(spec, DiskIntegral):
        point = Mandelstams.from_planar(spec.n, dict.fromkeys(variables, ONE), spec.ordering)
        _, f = in_standard_order(point, spec.f, spec.ordering)
        inside = _consecutive(spec.n, f)
        back = spec.ordering
        named = {tuple(sorted(back[label - 1] for label in labels)) for labels in inside}
    else:
        named = _consecutive(spec.n, spec.f) & _consecutive(spec.n, spec.g)
    found = []
    everything = set(range(1, spec.n + 1))
    for labels in sorted(named, key=lambda labels: (len(labels), labels)):
        other = tuple(sorted(everything - set(labels)))
        channel = next((c for c in (labels, other) if c in variables), None)
        if channel is not None:
            found.append(channel)
        elif isinstance(spec, SphereIntegral):
            found.append(labels)
    return tuple(found)


def _consecutive(n: int, f: Integrand) -> set[Channel]:
    found = set()
    for word in chains(n, f):
        full = (1, *word)
        for size in range(2, n - 1):
            found |= {tuple(sorted(full[start : start + size])) for start in range(n - size)}
    return found


def _exponents(variables: int, degree: int) -> list[tuple[int, ...]]:
    found = []
    for chosen in combinations_with_replacement(range(variables), max(degree, 0)):
        exponents = [0] * variables
        for k in chosen:
            exponents[k] += 1
        found.append(tuple(exponents))
    return found if degree >= 0 else []


def _monomial(values: Sequence[Exact], exponents: Sequence[int]) -> Exact:
    total = ONE
    for value, k in zip(values, exponents, strict=True):
        if k:
            total = total * value**k
    return total


def _sample(
    spec: Spec,
    n: int,
    variables: Sequence[Channel],
    poles: Sequence[Channel],
    product: Product,
    weight: int,
    rng: random.Random,
) -> tuple[list[Exact], Exact]:
    """A random point and the coefficient there, times the channels that may be poles."""
    while True:
        at = [Exact(rng.choice([-1, 1]) * rng.randint(1, _RANGE)) for _ in variables]
        kin = Mandelstams.from_planar(n, dict(zip(variables, at, strict=True)), _ordering(spec))
        if all(kin.pairs) and all(kin.channel(c) for c in poles):
            try:
                series = series_of(spec, kin, weight)
            except KNError:  # a pole that the claimed channels do not name would show in the checks
                continue
            value = dict(series[weight].terms).get(product, ZERO)
            for channel in poles:
                value = value * kin.channel(channel)
            return at, value


def _solve(
    points: Sequence[Sequence[Exact]], values: Sequence[Exact], exponents: Sequence[tuple[int, ...]]
) -> dict[tuple[int, ...], Exact] | None:
    """The polynomial through the points; None where they do not determine it."""
    from flint import fmpz_mat

    if not exponents:
        return {} if not any(values) else None
    size = len(exponents)
    matrix = fmpz_mat(len(points), size + 1)
    for i, (at, value) in enumerate(zip(points, values, strict=True)):
        p, _, d = value.as_ratio()
        for k, e in enumerate(exponents):
            matrix[i, k] = int(_monomial(at, e)) * d
        matrix[i, size] = p
    echelon, _, rank = matrix.rref()
    if rank < size or any(not echelon[i, i] for i in range(size)):
        return None
    if rank > size:
        raise KNError("exact values of a coefficient are not those of a polynomial of the expected degree")
    found = {}
    for i, e in enumerate(exponents):
        top, bottom = int(echelon[i, size]), int(echelon[i, i])
        if top:
            found[e] = Exact.from_ratio(top if bottom > 0 else -top, 0, abs(bottom))
    return found


def _lowest(
    numerator: dict[tuple[int, ...], Exact], variables: Sequence[Channel], poles: Sequence[Channel]
) -> tuple[dict[tuple[int, ...], Exact], tuple[Channel, ...]]:
    """Cancel the channels that divide the numerator."""
    left = []
    for channel in poles:
        if channel in variables:
            k = variables.index(channel)
            if all(e[k] for e in numerator):
                numerator = {(*e[:k], e[k] - 1, *e[k + 1 :]): c for e, c in numerator.items()}
                continue
        left.append(channel)
    return numerator, tuple(left)


def _name(channel: Channel, latex: bool = False) -> str:
    labels = "".join(map(str, channel)) if max(channel) < 10 else ",".join(map(str, channel))
    return f"s_{{{labels}}}" if latex else f"s{labels}" if max(channel) < 10 else f"s({labels})"


def _text(result: CoefficientFunction, number: Any, times: str, power: str, latex: bool = False) -> str:
    text = ""
    for exponents, c in sorted(result.numerator.items(), reverse=True):
        size = -c if c < 0 else c
        text += (" - " if c < 0 else " + ") if text else ("-" if c < 0 else "")
        factors = [] if size == 1 and any(exponents) else [number(size)]
        for channel, k in zip(result.channels, exponents, strict=True):
            if k:
                factors.append(_name(channel, latex) + (power.format(k) if k > 1 else ""))
        text += times.join(factors)
    return text


__all__ = ["CoefficientFunction", "reconstruct"]
