"""Affine forms in named unknowns, read off from formulas, and the exact solution of affine equations."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field

from ...errors import InputError
from ...exact import ZERO, Exact
from .nodes import Invariant, Node, Number, Parameter, Power, Product, Sum


@dataclass(frozen=True)
class Affine:
    """``constant + sum coefficient * unknown``; unknowns are numbered."""

    constant: Exact = ZERO
    coefficients: Mapping[int, Exact] = field(default_factory=dict)

    def __add__(self, other: Affine) -> Affine:
        found = dict(self.coefficients)
        for k, c in other.coefficients.items():
            found[k] = found.get(k, ZERO) + c
        return Affine(self.constant + other.constant, {k: c for k, c in found.items() if c})

    def times(self, factor: Exact) -> Affine:
        """Multiplied by a number."""
        return Affine(self.constant * factor, {k: c * factor for k, c in self.coefficients.items() if factor})

    def __sub__(self, other: Affine) -> Affine:
        return self + other.times(Exact(-1))

    def at(self, values: Sequence[Exact]) -> Exact:
        """The value where unknown k is ``values[k]``."""
        total = self.constant
        for k, c in self.coefficients.items():
            total = total + c * values[k]
        return total


def affine_form(
    node: Node, invariant: Callable[[tuple[int, ...]], Affine], parameters: Mapping[str, Affine], name: str
) -> Affine:
    """The affine form of a formula.

    Raises
    ------
    InputError
        Named ``name``, when the formula is not linear in the invariants.
    """

    def form(part: Node) -> Affine:
        match part:
            case Number(value):
                return Affine(value)
            case Parameter(key, _):
                return parameters[key]
            case Invariant(labels):
                return invariant(labels)
            case Sum(terms, negative):
                total = Affine()
                for term, minus in zip(terms, negative, strict=True):
                    total = total - form(term) if minus else total + form(term)
                return total
            case Product(factors, inverse):
                total = Affine(Exact(1))
                for factor, divide in zip(factors, inverse, strict=True):
                    other = form(factor)
                    if divide and not other.coefficients and other.constant:
                        total = total.times(1 / other.constant)
                    elif not divide and not other.coefficients:
                        total = total.times(other.constant)
                    elif not divide and not total.coefficients:
                        total = other.times(total.constant)
                    else:
                        raise _not_linear(name)
                return total
            case Power(base, exponent):
                inside, count = form(base), form(exponent)
                if inside.coefficients or count.coefficients or not count.constant.is_integer:
                    raise _not_linear(name)
                if abs(count.constant) > 20 or not inside.constant:
                    raise _not_linear(name)
                return Affine(inside.constant ** int(count.constant))
            case _:
                raise _not_linear(name)

    return form(node)


def _not_linear(name: str) -> InputError:
    return InputError(name, "a formula that is not linear", "a linear combination of invariants with rational numbers")


def solve(equations: Sequence[Affine], unknowns: Sequence[int]) -> dict[int, Affine] | None:
    """Solve ``equation = 0`` for as many unknowns as there are independent equations.

    Parameters
    ----------
    equations
        Affine forms.
    unknowns
        In the order in which they should be eliminated.

    Returns
    -------
    dict or None
        The eliminated unknowns in terms of the others; None when the equations contradict each other.
    """
    solved: dict[int, Affine] = {}
    for equation in equations:
        rest = _inserted(equation, solved)
        pivot = next((k for k in unknowns if k in rest.coefficients), None)
        if pivot is None:
            if rest.constant:
                return None
            continue
        lead = rest.coefficients[pivot]
        others = Affine(rest.constant, {k: c for k, c in rest.coefficients.items() if k != pivot})
        solution = others.times(-1 / lead)
        solved = {k: _inserted(form, {pivot: solution}) for k, form in solved.items()}
        solved[pivot] = solution
    return solved


def _inserted(form: Affine, solved: Mapping[int, Affine]) -> Affine:
    total = Affine(form.constant, {k: c for k, c in form.coefficients.items() if k not in solved})
    for k, c in form.coefficients.items():
        if k in solved:
            total = total + solved[k].times(c)
    return total
