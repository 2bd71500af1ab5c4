"""Exact rational kinematics on a locus: inside convergence, beyond it, next to poles, real and complex.

The unknowns are the n(n-3)/2 planar invariants of one ordering; with the row sums that covariance demands they fix
every s_ij, affinely.  Linear conditions are solved exactly for some of the unknowns and the others are drawn at
random with a prime denominator, so that nothing lands on an integer by accident.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import combinations
from typing import Any

from ..channels import Channel, canonical, pair_index, pair_order, planar_channels
from ..errors import InputError
from ..exact import ONE, ZERO, Exact
from ..integrals import DiskIntegral, SphereIntegral
from ..kinematics import Mandelstams
from .expression import Affine, affine_form, parse, solve
from .expression.parser import is_name

KINDS = ("inside", "continued", "inside", "near pole", "complex", "continued", "inside", "complex continued")
_DENOMINATOR = 100_003
_ATTEMPTS = 400


@dataclass(frozen=True)
class Divisor:
    """A channel in which the integral can have poles: where ``X + offset`` is 0, -1, -2, ..."""

    channel: Channel
    offset: int


def _rows(spec: DiskIntegral | SphereIntegral) -> tuple[Exact, ...]:
    """The row sums that make the first monomial covariant (the others are checked at the first point)."""
    if not spec.f.terms:
        raise InputError("spec", "a vanishing integrand", "an integrand with a term at least")
    rows = [-2] * spec.n
    for (i, j), power in spec.f.terms[0].powers:
        rows[i - 1] -= power
        rows[j - 1] -= power
    return tuple(Exact(row) for row in rows)


class Locus:
    """The kinematics at which a formula is examined.

    Parameters
    ----------
    spec
        The integral; it fixes the row sums and the channels with poles.
    where
        Linear conditions, left side = right side.
    parameters
        Linear definitions of names, in terms of invariants and of names before.

    Raises
    ------
    InputError
        For conditions that are not linear or contradict each other.
    """

    def __init__(
        self, spec: DiskIntegral | SphereIntegral, where: Mapping[str, Any], parameters: Mapping[str, Any]
    ) -> None:
        self.spec = spec
        self.n = n = spec.n
        self.ordering = spec.ordering if isinstance(spec, DiskIntegral) else tuple(range(1, n + 1))
        self.rows = _rows(spec)
        self.basis = planar_channels(self.ordering)
        self.unknowns = range(len(self.basis))
        self._pairs = self._pair_forms()
        self.parameters: dict[str, Affine] = {}
        for name, text in parameters.items():
            if not isinstance(name, str) or not is_name(name):
                raise InputError("parameters", repr(name), "a name that is no invariant, constant or function")
            field = f"parameter {name}"
            node = parse(str(text), n, self.parameters, field)
            self.parameters[name] = affine_form(node, self.channel_form, self.parameters, field)
        self.equations = []
        for left, right in where.items():
            field = f"where {left} = {right}"
            sides = [
                affine_form(parse(str(side), n, self.parameters, field), self.channel_form, self.parameters, field)
                for side in (left, right)
            ]
            self.equations.append(sides[0] - sides[1])
        solved = solve(self.equations, self.unknowns)
        if solved is None:
            raise InputError("where", "conditions that contradict each other", "linear conditions with a solution")
        self.free = tuple(k for k in self.unknowns if k not in solved)
        self._solved = solved
        self.divisors = self._divisors()
        self._offset = {d.channel: d.offset for d in self.divisors}

    def _pair_forms(self) -> tuple[Affine, ...]:
        def at(k: int | None) -> tuple[Exact, ...]:
            values = {c: ONE if i == k else ZERO for i, c in enumerate(self.basis)}
            return Mandelstams.from_planar(self.n, values, self.ordering, self.rows).pairs

        base = at(None)
        units = [at(k) for k in self.unknowns]
        forms = []
        for p, constant in enumerate(base):
            steps = {k: unit[p] - constant for k, unit in enumerate(units)}
            forms.append(Affine(constant, {k: c for k, c in steps.items() if c}))
        return tuple(forms)

    def channel_form(self, labels: Sequence[int]) -> Affine:
        """The sum of s_ab inside a set of labels, in the unknowns."""
        total = Affine()
        for a, b in combinations(labels, 2):
            total = total + self._pairs[pair_index(self.n)[a, b]]
        return total

    def reduced(self, form: Affine) -> Affine:
        """A form on the locus, in the free unknowns alone."""
        total = Affine(form.constant, {k: c for k, c in form.coefficients.items() if k not in self._solved})
        for k, c in form.coefficients.items():
            if k in self._solved:
                total = total + self._solved[k].times(c)
        return total

    def subsets(self) -> tuple[Channel, ...]:
        """All channels, planar or not, up to complements; by size."""
        order = tuple(range(1, self.n + 1))
        sets = (s for size in range(2, self.n - 1) for s in combinations(order, size))
        return tuple(dict.fromkeys(canonical(s, order) for s in sets))

    def _divisors(self) -> tuple[Divisor, ...]:
        n = self.n
        point = self.point([ZERO] * len(self.basis))
        found: dict[Channel, int] = {}
        if isinstance(self.spec, DiskIntegral):
            for size in range(2, n - 1):
                for start in range(n - size):
                    labels = tuple(sorted(self.ordering[start : start + size]))
                    places = range(start + 1, start + size + 1)
                    inside = [pair_index(n)[pair] for pair in combinations(places, 2)]
                    x = point.channel(labels)
                    for term in self.spec.terms(point):
                        total = sum((term.pairs[k] for k in inside), ZERO) - x + (size - 1)
                        found[labels] = min(int(total), found.get(labels, int(total)))
            return tuple(Divisor(c, offset) for c, offset in found.items())
        for size in range(2, n - 1):
            for labels in combinations(range(1, n), size):
                inside = [pair_index(n)[pair] for pair in combinations(labels, 2)]
                for each in self.spec.terms(point):
                    powers = [sum(side[k] for k in inside) for side in (each.left, each.right)]
                    total_power = min(powers) + size - 1
                    found[labels] = min(total_power, found.get(labels, total_power))
        return tuple(Divisor(c, offset) for c, offset in found.items())

    # --- points -----------------------------------------------------------------------------------------------------

    def point(self, values: Sequence[Exact]) -> Mandelstams:
        """The kinematics with these planar invariants."""
        return Mandelstams(self.n, tuple(form.at(values) for form in self._pairs), self.rows)

    def coordinates(self, kin: Mandelstams) -> list[Exact]:
        """The free planar invariants at a point."""
        return [kin.channel(self.basis[k]) for k in self.free]

    def values_of(self, kin: Mandelstams) -> dict[str, Exact]:
        """The parameters at a point."""
        values = [kin.channel(c) for c in self.basis]
        return {name: form.at(values) for name, form in self.parameters.items()}

    def is_inside(self, kin: Mandelstams) -> bool:
        """Whether the integral converges at a point (as it stands, in every term)."""
        return all((kin.channel(d.channel) + d.offset).re > 0 for d in self.divisors)

    def _on_pole(self, kin: Mandelstams) -> bool:
        return any(x.is_integer and x.re + d.offset <= 0 for d in self.divisors for x in (kin.channel(d.channel),))

    def draw(self, kind: str, rng: Any, extra: Sequence[Affine] = ()) -> Mandelstams | None:
        """A random point of one kind on the locus, None when there seems to be none.

        Parameters
        ----------
        kind
            ``"inside"``, ``"continued"``, ``"complex"`` (inside), ``"complex continued"`` or ``"any"``.
        rng
            ``random.Random``.
        extra
            Affine forms that vanish at the point besides those of the locus.
        """
        continued = kind in ("continued", "complex continued")
        solved: dict[int, Affine] = {}
        for attempt in range(_ATTEMPTS):
            if attempt % 8 == 0:
                order = list(self.unknowns)
                rng.shuffle(order)
                solution = solve([*self.equations, *extra], order)
                if solution is None:
                    return None
                solved = solution
            shrink = 1 if attempt < _ATTEMPTS // 2 else 4  # some loci only have small regions of convergence
            values = [self._number(k, kind, rng, shrink) for k in self.unknowns]
            values = [solved[k].at(values) if k in solved else values[k] for k in self.unknowns]
            kin = self.point(values)
            if max((max(abs(x.re), abs(x.im)) for x in kin.pairs), default=0) > 12:
                continue
            if attempt < _ATTEMPTS // 2 and self._on_pole(kin):
                continue  # a locus may force a pole that cancels; then the later attempts let it pass
            if kind == "any" or self.is_inside(kin) is not continued:
                return kin
        return None

    def _number(self, k: int, kind: str, rng: Any, shrink: int) -> Exact:
        low, high = (-250_000, 130_000) if "continued" in kind or kind == "any" else (4_000, 90_000 // shrink)
        real = Fraction(rng.randint(low, high), _DENOMINATOR) - self._offset_of(k)
        imag = Fraction(rng.randint(-70_000, 70_000), _DENOMINATOR) if "complex" in kind else 0
        return Exact(real, imag)

    def _offset_of(self, k: int) -> int:
        labels = self.basis[k]
        if labels in self._offset:
            return self._offset[labels]
        rest = tuple(label for label in range(1, self.n + 1) if label not in labels)
        return self._offset.get(rest, 0)

    def near(self, form: Affine, rng: Any, distance: Fraction, kind: str = "any") -> Mandelstams | None:
        """A point at which an affine form has a small value; None where the locus holds the form fixed."""
        if not self.reduced(form).coefficients:
            return None
        return self.draw(kind, rng, [form - Affine(Exact(distance))])


def job_text(spec: DiskIntegral | SphereIntegral, kin: Mandelstams, comments: Sequence[str] = ()) -> str:
    """A job file that computes the integral at a point."""
    pairs = ", ".join(f'"{i}.{j}" = "{kin.pair(i, j)}"' for i, j in pair_order(kin.n))
    lines = [f"# {comment}" for comment in comments]
    lines += ["version = 1", f'verb = "{"disk" if isinstance(spec, DiskIntegral) else "sphere"}"', ""]
    lines += ["[kinematics]", f"n = {kin.n}", f"pairs = {{ {pairs} }}"]
    if not kin.is_massless:
        lines.append("row_sums = [" + ", ".join(f'"{row}"' for row in kin.row_sums) + "]")
    lines += ["", "[integrand]", f'f = "{spec.f}"']
    if isinstance(spec, DiskIntegral):
        lines.append(f"ordering = {list(spec.ordering)}")
    else:
        lines.append(f'g = "{spec.g}"')
    return "\n".join([*lines, "", "[accuracy]", "digits = 20", ""])
