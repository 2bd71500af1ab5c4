"""The expansion of an integral: coefficients order by order, as exact combinations and as numbers."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Any

from ..errors import InputError
from ..exact import Exact, read
from ..ratios import shown
from .zetas import ZetaSum


@dataclass(frozen=True)
class Coefficient:
    """One coefficient of an expansion.

    Attributes
    ----------
    weight : int
        The weight w of the zeta values in it; the highest one when the integrand has double poles.
    order : int
        The power of alpha' it stands at.
    value : float | complex | mpmath.mpf | mpmath.mpc
        The number; multiple-precision when ``digits`` was asked for.
    error : float
        A bound on the modulus of the error of ``value``.
    exact : ZetaSum | None
        The rational combination of multiple zeta values; None where it is not known.
    digits : int | None
        The digits that were asked for, None for doubles.
    basis : str
        What ``exact`` rests on: a derivation, a derivation confirmed by numbers, or a recognised number and how many
        digits that took; or why there is none.
    """

    weight: int
    order: int
    value: Any
    error: float
    exact: ZetaSum | None
    digits: int | None
    basis: str

    def to_dict(self) -> dict[str, Any]:
        """Plain data; numbers as text."""
        from ..report.plain import plain_number

        return {
            "weight": self.weight,
            "order": self.order,
            "value": plain_number(self.value, self.digits),
            "error": plain_number(self.error),
            "exact": None if self.exact is None else str(self.exact),
            "zeta_values": None if self.exact is None else self.exact.to_dict(),
            "basis": self.basis,
        }


@dataclass(frozen=True)
class AlphaSeries:
    """``sum_w coefficients[w] alpha'^(w + leading)`` for all invariants multiplied by alpha'.

    Attributes
    ----------
    n : int
    leading : int
        The power of alpha' of weight 0: ``-(n - 3)`` for integrals, 0 for entries of the matrix F.
    integral : Mapping
        What was expanded: plain data of the integral and the kinematic point.
    coefficients : tuple[Coefficient, ...]
        Weights 0 to the one asked for.
    method : str
        ``"associator"`` (exact), ``"recursion"`` (numbers), or both joined by ``+``.
    """

    n: int
    leading: int
    integral: Mapping[str, Any]
    coefficients: tuple[Coefficient, ...]
    method: str
    details: Mapping[str, Any] = field(default_factory=dict)

    def __post_init__(self) -> None:
        object.__setattr__(self, "integral", MappingProxyType(dict(self.integral)))
        object.__setattr__(self, "details", MappingProxyType(dict(self.details)))

    def __reduce__(self) -> tuple[Any, ...]:
        return (
            AlphaSeries,
            (self.n, self.leading, dict(self.integral), self.coefficients, self.method, dict(self.details)),
        )

    def __getitem__(self, weight: int) -> Coefficient:
        if isinstance(weight, bool) or not isinstance(weight, int) or not 0 <= weight < len(self.coefficients):
            raise InputError("weight", shown(weight), f"a weight from 0 to {len(self.coefficients) - 1}")
        return self.coefficients[weight]

    def __iter__(self) -> Any:
        return iter(self.coefficients)

    def __len__(self) -> int:
        return len(self.coefficients)

    @property
    def numeric(self) -> tuple[Any, ...]:
        """The coefficients as numbers, by weight."""
        return tuple(c.value for c in self.coefficients)

    @property
    def exact(self) -> tuple[ZetaSum | None, ...]:
        """The coefficients as combinations of multiple zeta values, by weight; None where not known."""
        return tuple(c.exact for c in self.coefficients)

    @property
    def is_exact(self) -> bool:
        """True when every coefficient is known exactly."""
        return all(c.exact is not None for c in self.coefficients)

    def partial_sum(self, alpha_prime: Any) -> Any:
        """The sum of the terms at hand; what is left out starts at the next weight.

        A double, or a multiple-precision number in the caller's working precision when digits were asked for.
        """
        x = read(alpha_prime, "alpha_prime")[0]
        if not x:
            raise InputError("alpha_prime", "0", "a number other than zero")
        total: Any = 0
        for c in self.coefficients:
            power: Exact = x**c.order
            total = total + power * c.value
        return total

    def sources(self) -> tuple[str, ...]:
        """The published sources of the methods that were used."""
        from ..report.sources import sources_of

        return sources_of(self.method, self.details)

    def bibtex(self) -> str:
        """The same as BibTeX entries."""
        from ..report.sources import bibtex_of

        return bibtex_of(self.method, self.details)

    def __str__(self) -> str:
        lines = [("weight", "order", "coefficient", "")]
        for c in self.coefficients:
            exact = "(a number only)" if c.exact is None else str(c.exact)
            lines.append((str(c.weight), f"alpha'^{c.order}", _short(c), exact))
        widths = [max(len(line[k]) for line in lines) for k in range(3)]
        return "\n".join(
            "  ".join([*(cell.ljust(width) for cell, width in zip(line, widths, strict=False)), line[3]]).rstrip()
            for line in lines
        )

    def latex(self, variable: str = r"\alpha'") -> str:
        r"""The series in LaTeX, one line; coefficients that are not known exactly as numbers."""
        parts = []
        for c in self.coefficients:
            if (c.exact is not None and not c.exact) or not c.value:
                continue
            body = str(c.value) if c.exact is None else c.exact.latex()
            power = "" if c.order == 0 else variable if c.order == 1 else f"{{{variable}}}^{{{c.order}}}"
            parts.append(rf"\left({body}\right)" + (" " + power if power else ""))
        rest = f"{{{variable}}}^{{{len(self.coefficients) + self.leading}}}"
        return " + ".join([*parts, rf"\mathcal{{O}}\left({rest}\right)"])

    def to_dict(self) -> dict[str, Any]:
        """Plain data: what was expanded, how, and every coefficient; numbers as text."""
        from ..report.plain import plain

        return {
            "n": self.n,
            "leading": self.leading,
            "integral": plain(dict(self.integral)),
            "method": self.method,
            "coefficients": [c.to_dict() for c in self.coefficients],
            "details": plain(dict(self.details)),
        }


def _short(c: Coefficient) -> str:
    from ..report.text import value_with_error

    return value_with_error(c.value, c.error, c.digits)
