"""Multiple zeta values as exact quantities: a basis for each weight, and rational combinations of basis elements.

Convention: ``zeta(n1, ..., nr) = sum over 0 < k1 < ... < kr of 1/(k1^n1 ... kr^nr)``, convergent for ``nr >= 2``; the
weight is ``n1 + ... + nr``.  (Part of the literature writes the indices in the opposite order.)

The basis is the usual one of the literature on string amplitudes: products of zeta(2), zeta(3), zeta(5), zeta(7),
zeta(3,5), zeta(9), zeta(3,7), zeta(11), zeta(3,3,5), zeta(3,9), zeta(1,1,4,6); Schlotterer, Stieberger 2012,
arXiv:1205.1516.  Its size ``d_w = d_(w-2) + d_(w-3)`` is Zagier's conjectured dimension: that every multiple zeta value
of the weight is a rational combination of it is proved (and done in ``reduction``), that the combination is unique
is conjectured.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cache
from typing import Any, TypeAlias

from ..errors import InputError
from ..exact import ONE, ZERO, Exact, read, read_integer
from ..ratios import shown

Composition: TypeAlias = tuple[int, ...]
Product: TypeAlias = tuple[Composition, ...]  # a product of generators, in the order of GENERATORS

GENERATORS: tuple[Composition, ...] = (
    (2,),
    (3,),
    (5,),
    (7,),
    (3, 5),
    (9,),
    (3, 7),
    (11,),
    (3, 3, 5),
    (3, 9),
    (1, 1, 4, 6),
)
MAX_WEIGHT = 12
_PLACE = {generator: k for k, generator in enumerate(GENERATORS)}


def read_weight(weight: Any, field: str = "weight") -> int:
    """A weight for which there is a basis."""
    found = read_integer(weight, field)
    if not 0 <= found <= MAX_WEIGHT:
        raise InputError(field, shown(weight), f"a weight from 0 to {MAX_WEIGHT}")
    return found


@cache
def basis(weight: int) -> tuple[Product, ...]:
    """The products of generators of one weight, those of few factors first.

    >>> basis(8)
    (((3, 5),), ((3,), (5,)), ((2,), (3,), (3,)), ((2,), (2,), (2,), (2,)))
    >>> [len(basis(w)) for w in range(13)]
    [1, 0, 1, 1, 1, 2, 2, 3, 4, 5, 7, 9, 12]
    """

    def products(left: int, first: int) -> list[Product]:
        if not left:
            return [()]
        found = []
        for k in range(first, len(GENERATORS)):
            size = sum(GENERATORS[k])
            if size <= left:
                found += [(GENERATORS[k], *rest) for rest in products(left - size, k)]
        return found

    return tuple(sorted(products(weight, 0), key=lambda p: (len(p), [-_PLACE[g] for g in p])))


def product_of(a: Product, b: Product) -> Product:
    """The product of two products, in standard order."""
    return tuple(sorted(a + b, key=_PLACE.__getitem__)) if a and b else a or b


def product_weight(product: Product) -> int:
    """The weight of a product of generators."""
    return sum(map(sum, product))


@dataclass(frozen=True, init=False)
class ZetaSum:
    """A combination of basis products with exact complex rational coefficients; immutable and hashable.

    Attributes
    ----------
    terms : tuple of (product, coefficient)
        Sorted by weight, then as in :func:`basis`; no zero coefficients.

    Examples
    --------
    >>> z2, z3 = zeta(2), zeta(3)
    >>> print(z2 * z2 * 5 - z3 / 2)
    -1/2*zeta(3) + 5*zeta(2)^2
    >>> print(zeta(4), "|", zeta(5, 3))
    2/5*zeta(2)^2 | -zeta(3,5) + zeta(3)*zeta(5) - 24/175*zeta(2)^4
    """

    terms: tuple[tuple[Product, Exact], ...]

    def __init__(self, terms: Mapping[Product, Exact] | Iterable[tuple[Product, Exact]] = ()) -> None:
        collected: dict[Product, Exact] = {}
        for product, coefficient in terms.items() if isinstance(terms, Mapping) else terms:
            collected[product] = collected.get(product, ZERO) + coefficient
        kept = [item for item in collected.items() if item[1]]
        if len(kept) > 1:
            kept.sort(key=lambda item: _order(item[0]))
        object.__setattr__(self, "terms", tuple(kept))

    def __bool__(self) -> bool:
        return bool(self.terms)

    def __add__(self, other: Any) -> ZetaSum:
        right = _as_sum(other)
        return NotImplemented if right is None else ZetaSum(self.terms + right.terms)

    __radd__ = __add__

    def __neg__(self) -> ZetaSum:
        return ZetaSum((product, -c) for product, c in self.terms)

    def __sub__(self, other: Any) -> ZetaSum:
        right = _as_sum(other)
        return NotImplemented if right is None else self + -right

    def __rsub__(self, other: Any) -> ZetaSum:
        left = _as_sum(other)
        return NotImplemented if left is None else left + -self

    def __mul__(self, other: Any) -> ZetaSum:
        if other.__class__ is Exact:
            return ZetaSum((product, c * other) for product, c in self.terms)
        right = _as_sum(other)
        if right is None:
            return NotImplemented
        return ZetaSum((product_of(p, q), a * b) for p, a in self.terms for q, b in right.terms)

    __rmul__ = __mul__

    def __truediv__(self, other: Any) -> ZetaSum:
        inverse: Exact = ONE / read(other, "divisor")[0]
        return self * inverse

    def coefficient(self, *generators: int | Composition) -> Exact:
        """The coefficient of a basis product: ``coefficient(2, 3)`` of zeta(2) zeta(3), ``coefficient((3, 5))``.

        >>> print((3 * zeta(3, 5) + 7 * zeta(2) * zeta(3)).coefficient(2, 3))
        7
        """
        product: Product = tuple((g,) if isinstance(g, int) else tuple(g) for g in generators)
        if any(g not in _PLACE for g in product):
            raise InputError("generators", shown(generators), f"generators of the basis: {GENERATORS}")
        wanted = tuple(sorted(product, key=_PLACE.__getitem__))
        return dict(self.terms).get(wanted, ZERO)

    @property
    def weights(self) -> tuple[int, ...]:
        """The weights that occur."""
        return tuple(sorted({product_weight(product) for product, _ in self.terms}))

    @property
    def is_real(self) -> bool:
        """True when all coefficients are real."""
        return all(c.is_real for _, c in self.terms)

    def value(self, digits: int = 15) -> Any:
        """The number, as an mpmath number with about ``digits`` correct digits.

        >>> print(zeta(3, 5).value(20))
        0.0377076729848475
        """
        from .numeric import value_of

        return value_of(self, digits)

    def __str__(self) -> str:
        """Text such as ``-47*zeta(2)``, products joined by ``*``."""
        return _text(self.terms, str, lambda g: f"zeta({','.join(map(str, g))})", "*", "^{}")

    def latex(self) -> str:
        r"""LaTeX such as ``-47 \zeta_{2}``.

        >>> print((zeta(3, 5) / 2 - zeta(2) * zeta(2)).latex())
        -\zeta_{2}^{2} + \frac{1}{2} \zeta_{3,5}
        """
        return _text(self.terms, latex_number, lambda g: rf"\zeta_{{{','.join(map(str, g))}}}", " ", "^{{{}}}")

    def __repr__(self) -> str:
        return f"ZetaSum({self})"

    def to_dict(self) -> dict[str, str]:
        """Plain data: coefficient texts by product texts, ``{"zeta(2)*zeta(3)": "7"}``; ``"1"`` for no zeta value."""
        return {str(ZetaSum([(product, ONE)])): str(c) for product, c in self.terms}


def _order(product: Product) -> tuple[Any, ...]:
    return (product_weight(product), len(product), [-_PLACE[g] for g in product])


def _as_sum(value: Any) -> ZetaSum | None:
    if isinstance(value, ZetaSum):
        return value
    try:
        return ZetaSum([((), read(value, "coefficient")[0])])
    except InputError:
        return None


def latex_number(number: Exact) -> str:
    """A rational number in LaTeX; complex ones in brackets."""
    if number.is_real:
        p, _, d = number.as_ratio()
        if d == 1:
            return str(p)
        return ("-" if p < 0 else "") + rf"\frac{{{abs(p)}}}{{{d}}}"
    sign = "-" if number.im < 0 else "+"
    real = latex_number(Exact(number.re)) + " " + sign + " " if number.re else ("-" if number.im < 0 else "")
    return rf"\left({real}{latex_number(Exact(abs(number.im)))} i\right)"


def _text(terms: Any, number: Any, generator: Any, times: str, power: str) -> str:
    if not terms:
        return "0"
    text = ""
    for product, coefficient in terms:
        negative = coefficient.is_real and coefficient < 0
        size = -coefficient if negative else coefficient
        text += (" - " if negative else " + ") if text else ("-" if negative else "")
        factors = []
        for g in dict.fromkeys(product):
            count = product.count(g)
            factors.append(generator(g) + (power.format(count) if count > 1 else ""))
        if size != ONE or not factors:
            shown_size = number(size)
            factors.insert(0, shown_size if size.is_real or times == " " else f"({shown_size})")
        text += times.join(factors)
    return text


def read_composition(indices: Iterable[Any]) -> Composition:
    """The indices of a convergent multiple zeta value."""
    found = tuple(read_integer(n, "zeta index") for n in indices)
    if not found or min(found) < 1 or found[-1] < 2:
        raise InputError("zeta indices", shown(found), "positive integers, the last one at least 2 (convergence)")
    return found


def zeta(*indices: int) -> ZetaSum:
    """A multiple zeta value of weight at most 12 in the basis: an exact identity, not a numerical fit.

    >>> print(zeta(1, 2))
    zeta(3)
    """
    composition = read_composition(indices)
    read_weight(sum(composition), "weight of the zeta value")
    from .reduction import reduced

    return ZetaSum(reduced(composition))


ZETA_ONE = ZetaSum([((), ONE)])
