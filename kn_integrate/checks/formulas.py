"""A formula that can be evaluated: text of the expression language, or a function of the invariants."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Protocol

from ..closed_forms.working import Big, Context, context, ordinary, rounded
from ..errors import InputError
from ..exact import Exact, read
from ..kinematics import Mandelstams
from .expression import Node, UndefinedValueError, evaluate, parse
from .sampling import Locus

DOUBLE_DIGITS = 10  # what a function in double precision is held to


@dataclass(frozen=True)
class Measured:
    """A number with a bound on its error; ``most`` limits the digits that may be asked of it."""

    value: Any
    error: Any
    most: int | None = None

    def number(self, ctx: Context) -> Big:
        """The value in another context."""
        if hasattr(self.value, "_mpf_") or hasattr(self.value, "_mpc_"):
            return ctx.convert(ordinary(self.value))
        return ctx.convert(self.value)

    def text(self, digits: int = 20) -> str:
        """The value as text."""
        ctx = context(digits + 10)
        return str(ctx.nstr(self.number(ctx), digits))


class Formula(Protocol):
    """Something with a value at every point."""

    def at(self, kin: Mandelstams, digits: int) -> Measured:
        """The value to a number of digits, with an error bound."""


@dataclass(frozen=True)
class TextFormula:
    """A parsed formula."""

    node: Node
    locus: Locus

    def at(self, kin: Mandelstams, digits: int) -> Measured:
        """Two precisions give the value and its error; where they differ too much, higher ones."""
        parameters = self.locus.values_of(kin)
        working = digits + 5
        last = evaluate(self.node, context(working), kin.channel, parameters)
        for _ in range(4):
            working += working // 5 + 8
            ctx = context(working)
            value = evaluate(self.node, ctx, kin.channel, parameters)
            error = abs(value - ctx.convert(ordinary(last)))
            if error <= max(abs(value), ctx.mpf(10) ** -digits) * ctx.mpf(10) ** -digits:
                break
            last = value
        return Measured(value, ordinary(error))

    def quick(self, kin: Mandelstams, digits: int) -> Any:
        """The value at one precision, without an error."""
        return evaluate(self.node, context(digits + 8), kin.channel, self.locus.values_of(kin))


class Point:
    """What a formula given as a function receives.

    Attributes
    ----------
    digits : int
        Decimal digits that are wanted.
    ctx : mpmath context
        A context of this precision, with ``gamma``, ``hyp3f2``...
    kin : Mandelstams
        The exact kinematics.
    """

    def __init__(self, kin: Mandelstams, digits: int, parameters: dict[str, Exact]) -> None:
        self.kin = kin
        self.digits = digits
        self.ctx = context(digits + 15)
        self.parameters = parameters

    def s(self, i: int, j: int) -> Any:
        """s_ij in the context."""
        return rounded(self.ctx, self.kin.pair(i, j))

    def X(self, *labels: int) -> Any:
        """The channel with these labels, in the context."""
        return rounded(self.ctx, self.kin.channel(labels))

    def __getitem__(self, name: str) -> Any:
        """A parameter, in the context."""
        return rounded(self.ctx, self.parameters[name])


@dataclass(frozen=True)
class FunctionFormula:
    """A function of :class:`Point`."""

    function: Callable[[Any], Any]
    locus: Locus

    def at(self, kin: Mandelstams, digits: int) -> Measured:
        """The value; its precision is what its mantissa shows, at most what was asked.

        Functions that compute in double precision (``math``, the global mpmath context) are recognised by mantissas
        of 53 bits and held to ten digits.
        """
        try:
            value = self.function(Point(kin, digits, self.locus.values_of(kin)))
        except (ZeroDivisionError, ValueError, OverflowError) as error:
            raise UndefinedValueError(str(error)) from None
        exact = read(value, "value of the formula")[0]
        ctx = context(digits + 15)
        number = rounded(ctx, exact)
        bits = 54
        raw = [value._mpf_] if hasattr(value, "_mpf_") else list(getattr(value, "_mpc_", ()))
        bits = max([bits, *(int(part[1]).bit_length() for part in raw)])
        if bits <= 64:
            return Measured(number, ordinary(abs(number) * ctx.mpf(10) ** -(DOUBLE_DIGITS + 1)), DOUBLE_DIGITS)
        return Measured(number, ordinary(abs(number) * ctx.mpf(2) ** -(min(bits, ctx.prec) - 20)))


def read_formula(formula: str | Callable[[Any], Any], locus: Locus) -> Formula:
    """Text is parsed, functions are taken as they are."""
    if isinstance(formula, str):
        return TextFormula(parse(formula, locus.n, locus.parameters), locus)
    if callable(formula):
        return FunctionFormula(formula, locus)
    raise InputError("formula", type(formula).__name__, "text, or a function of the invariants")
