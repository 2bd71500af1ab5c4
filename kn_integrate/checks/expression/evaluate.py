"""The value of a formula at exact kinematics.

Values stay exact rationals as long as the formula does arithmetic, and become numbers of the given precision in its
functions: whether a Gamma function sits on a pole, or a hypergeometric series ends, is then decided and not guessed.
Gamma on a pole is kept as such until something is divided by it, because 1/Gamma is entire.

Hypergeometric functions at argument 1 are continued in their parameters, see ``closed_forms.unit_series``: beyond
convergence the series is the wrong definition for an integral that is continued.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any

from mpmath.libmp import NoConvergence

from ...closed_forms.gammas import is_pole
from ...closed_forms.unit_series import unit_series
from ...closed_forms.working import Big, Context, rounded
from ...errors import KNError, PoleError
from ...exact import ONE, ZERO, Exact, read
from .nodes import Call, Invariant, Node, Number, Parameter, Pi, Power, Product, Sum

MAX_ARGUMENT = {"gamma": 10**4, "beta": 10**4, "zeta": 500, "sin": 10**6, "cos": 10**6, "exp": 10**5, "log": 10**40}
MAX_HYPERGEOMETRIC = 300
MAX_POWER = 10**4
MAX_BITS = 40_000  # of an exact intermediate result
MAX_MAGNITUDE = 10**6  # binary exponent of a rounded one


class UndefinedValueError(KNError):
    """The formula has no value at this point: a division by zero, or a function on its pole."""


class OutOfRangeError(KNError):
    """A value that the language refuses to compute: too large an argument or power, or a series that does not end."""


class _GammaPole:
    """Gamma at 0, -1, -2, ...: only good for being divided by."""


_POLE = _GammaPole()


def evaluate(
    node: Node, ctx: Context, invariant: Callable[[tuple[int, ...]], Exact], parameters: Mapping[str, Exact]
) -> Big:
    """The value in a multiple-precision context.

    Parameters
    ----------
    node
        From :func:`.parser.parse`.
    ctx
        A private mpmath context; its precision is the working precision.
    invariant
        The exact value of the invariant with these labels.
    parameters
        The exact value of every parameter.

    Raises
    ------
    UndefinedValueError, OutOfRangeError
        See there.
    """
    value = _Evaluator(ctx, invariant, parameters).value(node)
    if isinstance(value, _GammaPole):
        raise UndefinedValueError("the formula has a pole here")
    return rounded(ctx, value) if isinstance(value, Exact) else value


def _small(value: Exact) -> bool:
    return max(part.bit_length() for part in value.as_ratio()) <= MAX_BITS


def _beyond(value: Any, limit: int) -> bool:
    """Whether a number is larger than a limit; exact numbers may be too large for a float."""
    if isinstance(value, Exact):
        return max(abs(value.re), abs(value.im)) > limit
    return bool(abs(value) > limit)


class _Evaluator:
    def __init__(
        self, ctx: Context, invariant: Callable[[tuple[int, ...]], Exact], parameters: Mapping[str, Exact]
    ) -> None:
        self.ctx = ctx
        self.invariant = invariant
        self.parameters = parameters

    def value(self, node: Node) -> Any:
        """Exact, a number of the context, or a Gamma pole."""
        match node:
            case Number(value):
                return value
            case Pi():
                return +self.ctx.pi
            case Parameter(name, _):
                return self.parameters[name]
            case Invariant(labels):
                return self.invariant(labels)
            case Sum():
                return self.sum(node)
            case Product():
                return self.product(node)
            case Power():
                return self.power(node)
            case Call():
                return self.checked(self.call(node))

    def finite(self, node: Node) -> Any:
        value = self.value(node)
        if isinstance(value, _GammaPole):
            raise UndefinedValueError("a Gamma function sits on its pole")
        return value

    def big(self, value: Any) -> Big:
        return rounded(self.ctx, value) if isinstance(value, Exact) else value

    def checked(self, value: Any) -> Any:
        """The value, unless it is not finite or of an absurd size."""
        if isinstance(value, _GammaPole):
            return value
        if isinstance(value, Exact):
            return value if _small(value) else self.checked(self.big(value))
        if not self.ctx.isfinite(value):
            raise UndefinedValueError("a value that is not finite")
        if value and abs(self.ctx.mag(value)) > MAX_MAGNITUDE:
            raise OutOfRangeError("a value beyond 2^(+-1000000)")
        return value

    def combine(self, a: Any, b: Any, operation: Callable[[Any, Any], Any]) -> Any:
        if isinstance(a, Exact) and isinstance(b, Exact):
            return self.checked(operation(a, b))
        return self.checked(operation(self.big(a), self.big(b)))

    def sum(self, node: Sum) -> Any:
        total: Any = ZERO
        for term, negative in zip(node.terms, node.negative, strict=True):
            value = self.finite(term)
            total = self.combine(total, -value if negative else value, lambda x, y: x + y)
        return total

    def product(self, node: Product) -> Any:
        total: Any = ONE
        poles = 0
        for factor, inverse in zip(node.factors, node.inverse, strict=True):
            value = self.value(factor)
            if isinstance(value, _GammaPole):
                poles += -1 if inverse else 1
                if poles > 0 or not inverse:
                    raise UndefinedValueError("a Gamma function sits on its pole")
                continue
            if inverse and not value:
                raise UndefinedValueError("a division by zero")
            total = self.combine(total, value, (lambda x, y: x / y) if inverse else (lambda x, y: x * y))
        return ZERO if poles < 0 else total

    def power(self, node: Power) -> Any:
        base, exponent = self.value(node.base), self.finite(node.exponent)
        if isinstance(base, _GammaPole):
            if isinstance(exponent, Exact) and exponent.is_integer and exponent.re < 0:
                return ZERO
            raise UndefinedValueError("a Gamma function sits on its pole")
        if _beyond(exponent, MAX_POWER):
            raise OutOfRangeError(f"an exponent beyond {MAX_POWER}")
        if not base:
            if isinstance(exponent, Exact) and exponent.is_real and exponent.re >= 0:
                return ZERO if exponent else ONE
            raise UndefinedValueError("zero to a power that is not positive")
        if isinstance(exponent, Exact) and exponent.is_integer:
            count = int(exponent)
            if isinstance(base, Exact) and max(part.bit_length() for part in base.as_ratio()) * abs(count) <= MAX_BITS:
                return base**count
            return self.checked(self.big(base) ** count)
        return self.checked(self.ctx.power(self.big(base), self.big(exponent)))

    def call(self, node: Call) -> Any:
        groups = [[self.finite(member) for member in group] for group in node.groups]
        try:
            if node.name == "pFq":
                return self.hypergeometric(groups[0], groups[1], groups[2][0])
            (members,) = groups
            if node.name == "hyp2f1":
                return self.hypergeometric(members[:2], members[2:3], members[3])
            if node.name == "hyp3f2":
                return self.hypergeometric(members[:3], members[3:5], members[5])
            if any(_beyond(x, MAX_ARGUMENT[node.name]) for x in members):
                raise OutOfRangeError(f"an argument of {node.name} beyond {MAX_ARGUMENT[node.name]}")
            return self.elementary(node.name, members)
        except PoleError as error:
            raise UndefinedValueError(str(error)) from None
        except NoConvergence:
            raise OutOfRangeError(f"{node.name} does not converge") from None
        except (ZeroDivisionError, ValueError) as error:
            raise UndefinedValueError(f"{node.name}: {error}") from None

    def elementary(self, name: str, members: Sequence[Any]) -> Any:
        ctx = self.ctx
        if name == "beta":
            a, b = members
            total = self.combine(a, b, lambda x, y: x + y)
            if any(isinstance(x, Exact) and is_pole(x) for x in (a, b)):
                raise UndefinedValueError("a beta function sits on its pole")
            if isinstance(total, Exact) and is_pole(total):
                return ZERO
            return ctx.gamma(self.big(a)) * ctx.gamma(self.big(b)) * ctx.rgamma(self.big(total))
        (x,) = members
        if name == "gamma":
            return _POLE if isinstance(x, Exact) and is_pole(x) else ctx.gamma(self.big(x))
        if name in ("exp", "sin", "cos") and abs(ctx.im(self.big(x))) > MAX_ARGUMENT["exp"]:
            raise OutOfRangeError(f"an argument of {name} beyond {MAX_ARGUMENT['exp']}")
        if name == "log" and not x:
            raise UndefinedValueError("the logarithm of zero")
        if name == "zeta" and isinstance(x, Exact) and x == 1:
            raise UndefinedValueError("zeta(1)")
        return getattr(ctx, name)(self.big(x))

    def hypergeometric(self, above: Sequence[Any], below: Sequence[Any], argument: Any) -> Any:
        """pFq; at argument 1 with p = q + 1 as the continuation in the parameters."""
        ctx = self.ctx
        if any(_beyond(x, MAX_HYPERGEOMETRIC) for x in (*above, *below)):
            raise OutOfRangeError(f"a hypergeometric parameter beyond {MAX_HYPERGEOMETRIC}")
        if isinstance(argument, Exact) and not argument:
            return ONE
        a, b = [self.exact(x) for x in above], [self.exact(x) for x in below]
        if len(a) == len(b) + 1 and isinstance(argument, Exact) and argument == 1:
            for x in list(a):  # a pair of equal parameters drops out, on a pole as well
                if x in b and len(b) > 1:
                    a.remove(x)
                    b.remove(x)
            if any(is_pole(x) for x in b):
                raise UndefinedValueError("a lower hypergeometric parameter is 0, -1, -2, ...")
            value = unit_series(ctx, a, b)
            for x in b:
                value *= ctx.gamma(rounded(ctx, x))
            return value
        z = self.big(argument)
        ends = [int(-x.re) for x in a if is_pole(x)]
        if any(is_pole(x) and (not ends or min(ends) > -x.re) for x in b):
            raise UndefinedValueError("a lower hypergeometric parameter is 0, -1, -2, ...")
        if len(a) > len(b) + 1 and not ends:
            raise OutOfRangeError("a hypergeometric series that converges nowhere")
        if not ends and len(a) == len(b) + 1 and abs(z) >= ctx.mpf("0.9"):
            if len(a) == 2:
                return ctx.hyp2f1(rounded(ctx, a[0]), rounded(ctx, a[1]), rounded(ctx, b[0]), z, maxterms=20_000)
            raise OutOfRangeError("a pFq with |argument| >= 0.9 that is not 1 and not a 2F1")
        if abs(z) > 100:
            raise OutOfRangeError("a hypergeometric argument beyond 100")
        return self.series(a, b, z, min(ends) if ends else None)

    def exact(self, x: Any) -> Exact:
        return x if isinstance(x, Exact) else read(x, "parameter")[0]

    def series(self, a: Sequence[Exact], b: Sequence[Exact], z: Big, last: int | None) -> Big:
        """The sum of the series, term by term."""
        ctx = self.ctx
        upper, lower = [rounded(ctx, x) for x in a], [rounded(ctx, x) for x in b]
        term = total = ctx.one
        small = ctx.mpf(2) ** (-ctx.prec)
        turn = 2 * max([abs(x) for x in (*upper, *lower)], default=0) + 2 * abs(z)
        for k in range(20_000):
            if last is not None and k >= last:
                return total
            for x in upper:
                term *= x + k
            for x in lower:
                term /= x + k
            term *= z / (k + 1)
            total += term
            if k > turn and abs(term) <= small * abs(total):
                return total
        raise OutOfRangeError("a hypergeometric series of more than 20000 terms")
