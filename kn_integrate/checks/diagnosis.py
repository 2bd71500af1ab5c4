"""How a formula is wrong: hypotheses in the order from special to general, the first one that fits at every probe.

All of them look at the ratio formula/integral, which is meromorphic, at exact points of the locus.  A diagnosis is a
hypothesis that survived a few independent points at many digits; like agreement it is evidence, not proof.
"""

from __future__ import annotations

import random
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from typing import Any

from ..channels import Channel
from ..closed_forms.working import Big, Context, context, rounded
from ..errors import KNError, NotAvailableError, PoleError, WorkLimitError
from ..exact import Exact, read
from ..kinematics import Mandelstams
from .examine import Laboratory, Trial
from .expression import Affine, Node, OutOfRangeError, UndefinedValueError
from .expression.nodes import Call, Number, Power, Product, Sum
from .formulas import TextFormula
from .relatives import other_integral

SHIFTS = tuple(Fraction(k, 2) for k in (2, -2, 1, -1, 4, -4))
NO_VALUE = (UndefinedValueError, OutOfRangeError, PoleError, WorkLimitError, NotAvailableError)


@dataclass(frozen=True)
class Diagnosis:
    """What is wrong; ``channel`` and ``level`` where they say something."""

    kind: str
    text: str
    channel: Channel | None = None
    level: int | None = None


class Ratios:
    """The ratio formula/integral at points that are drawn when a hypothesis asks for them."""

    def __init__(self, lab: Laboratory, rng: random.Random) -> None:
        self.lab = lab
        self.locus = lab.locus
        self.rng = rng
        self.ctx: Context = context(lab.digits + 20)
        self.tolerance = self.ctx.mpf(10) ** -min(lab.digits - 4, 8 if self._is_rough() else 100)
        self._known: dict[Mandelstams, Big | None] = {}

    def _is_rough(self) -> bool:
        kin = self.draw("any")
        try:
            return kin is not None and self.lab.formula.at(kin, 30).most is not None
        except NO_VALUE:
            return False

    def draw(self, kind: str, extra: Sequence[Affine] = ()) -> Mandelstams | None:
        """A point of this kind, or of any kind."""
        return self.locus.draw(kind, self.rng, extra) or self.locus.draw("any", self.rng, extra)

    def both(self, kin: Mandelstams) -> tuple[Big, Big] | None:
        """Formula and integral at a point, None where one has no value."""
        digits = self.lab.digits + 2
        try:
            integral = self.lab.source(self.lab.spec, kin, digits).number(self.ctx)
            return self.lab.formula.at(kin, digits).number(self.ctx), integral
        except NO_VALUE:
            return None

    def at(self, kin: Mandelstams | None) -> Big | None:
        """The ratio; None where there is none, or it vanishes."""
        if kin is None:
            return None
        if kin not in self._known:
            found = self.both(kin)
            self._known[kin] = found[0] / found[1] if found is not None and found[0] and found[1] else None
        return self._known[kin]

    def same(self, a: Big, b: Big) -> bool:
        """Equal within what the two sides are known to."""
        return bool(abs(a - b) <= self.tolerance * max(abs(a), abs(b)))

    def sample(self, count: int, kind: str = "inside") -> list[tuple[Mandelstams, Big]]:
        """Points with ratios."""
        found = []
        for _ in range(count + 4):
            kin = self.draw(kind)
            ratio = self.at(kin)
            if kin is not None and ratio is not None:
                found.append((kin, ratio))
            if len(found) == count:
                break
        return found


def dotted(labels: Channel) -> str:
    """The name of a channel."""
    return ".".join(map(str, labels))


def diagnose(lab: Laboratory, trials: tuple[Trial, ...], rng: random.Random) -> Diagnosis:
    """The first hypothesis that fits."""
    ratios = Ratios(lab, rng)
    for hypothesis in (_nowhere, _regions):
        found = hypothesis(trials)
        if found is not None:
            return found
    for test in (_constant, _shifted, other, _difference, _one_channel, _sines, _affine, _poles):
        found = test(ratios)
        if found is not None:
            return found
    return Diagnosis("unknown", "the ratio of formula and integral is none of the kinds that are recognised")


def _nowhere(trials: tuple[Trial, ...]) -> Diagnosis | None:
    missing = [t for t in trials if t.verdict == "disagrees" and t.formula is None]
    if len(missing) < max(1, len(trials) // 2):
        return None
    return Diagnosis("pole", f"the formula has no value where the integral has one ({missing[0].reason})")


def _regions(trials: tuple[Trial, ...]) -> Diagnosis | None:
    good = {t.region for t in trials if t.verdict == "agrees"}
    bad = {t.region for t in trials if t.verdict == "disagrees"}
    if "inside" not in good or "inside" in bad:
        return None
    if bad <= {"complex", "complex continued"} and "continued" not in bad:
        return Diagnosis("complex", "the formula holds at real kinematics and fails at complex ones")
    if "complex" not in bad:
        return Diagnosis("continuation", "the formula holds where the integral converges and fails beyond")
    return Diagnosis("continuation", "the formula holds at real points of convergence only")


# --- a constant -----------------------------------------------------------------------------------------------------


def constant_text(ctx: Context, value: Big, tolerance: Big) -> str | None:
    """A number as sign * rational * power of pi (and i), the simplest one.

    >>> ctx = context(30)
    >>> constant_text(ctx, -3 * ctx.pi**2 / 2, ctx.mpf(10) ** -20)
    '-3/2*pi^2'
    """
    best: tuple[int, str] | None = None
    for unit, factor in (("", ctx.one), ("i", ctx.j)):
        for power in range(-6, 7):
            x = value / factor / ctx.pi**power
            if abs(ctx.im(x)) > tolerance * abs(x):
                continue
            exact = read(ctx.re(x), "constant")[0].re.limit_denominator(100_000)
            if not exact or abs(ctx.mpf(exact.numerator) / exact.denominator - ctx.re(x)) > tolerance * abs(x):
                continue
            height = abs(exact.numerator) + exact.denominator + 3 * abs(power)
            pieces = [str(exact)] if abs(exact) != 1 or not (power or unit) else []
            sign = "-" if exact == -1 and not pieces else ""
            pieces += ([unit] if unit else []) + ([f"pi^{power}" if power != 1 else "pi"] if power else [])
            if height < 10**6 and (best is None or height < best[0]):
                best = (height, sign + "*".join(pieces))
    return None if best is None else best[1]


def _constant(ratios: Ratios) -> Diagnosis | None:
    found = [*ratios.sample(3), *ratios.sample(2, "continued"), *ratios.sample(1, "complex")]
    if len(found) < 4 or not all(ratios.same(found[0][1], r) for _, r in found[1:]):
        return None
    value = found[0][1]
    name = constant_text(ratios.ctx, value, ratios.tolerance) or f"the constant {ratios.ctx.nstr(value, 15)}"
    return Diagnosis("constant", f"the formula is the integral times {name} at every point")


# --- another integral -----------------------------------------------------------------------------------------------


def other(ratios: Ratios) -> Diagnosis | None:
    """The formula of another ordering, integrand, or with labels exchanged."""
    points = [kin for kin in (ratios.draw("inside"), ratios.draw("any"), ratios.draw("any")) if kin is not None]
    if len(points) < 3:
        return None
    digits = ratios.lab.digits + 2

    def formula(kin: Mandelstams) -> Big | None:
        try:
            return ratios.lab.formula.at(kin, digits).number(ratios.ctx)
        except NO_VALUE:
            return None

    def integral(spec: Any, kin: Mandelstams) -> Big | None:
        try:
            return ratios.lab.source(spec, kin, digits).number(ratios.ctx)
        except KNError:
            return None

    name = other_integral(ratios.lab.spec, points, formula, integral, ratios.same)
    return None if name is None else Diagnosis("other integral", f"the formula is that of {name}")


# --- a shifted argument ---------------------------------------------------------------------------------------------


def _variants(node: Node) -> Iterator[tuple[Node, str]]:
    """The formula with one argument of one Gamma-like function moved, and what was moved."""
    match node:
        case Sum(members, _):
            for k, member in enumerate(members):
                for new, text in _variants(member):
                    yield replace(node, terms=_with(members, k, new)), text
        case Product(members, _):
            for k, member in enumerate(members):
                for new, text in _variants(member):
                    yield replace(node, factors=_with(members, k, new)), text
        case Power(base, exponent):
            for new, text in _variants(base):
                yield Power(new, exponent), text
        case Call(name, groups, position) if name in ("gamma", "beta", "hyp2f1", "hyp3f2", "pFq"):
            last = (len(groups) - 1, len(groups[-1]) - 1) if name not in ("gamma", "beta") else None
            for g, group in enumerate(groups):
                for k, member in enumerate(group):
                    if (g, k) == last:
                        continue  # the argument of the series
                    for shift in SHIFTS:
                        moved = Sum((member, Number(Exact(shift))), (False, False))
                        new_call = Call(name, _with(groups, g, _with(group, k, moved)), position)
                        yield new_call, f"argument {k + 1} of {name} at position {position} is off by {-shift}"
        case _:
            pass


def _with(members: tuple[Any, ...], k: int, new: Any) -> tuple[Any, ...]:
    return (*members[:k], new, *members[k + 1 :])


def _shifted(ratios: Ratios) -> Diagnosis | None:
    formula = ratios.lab.formula
    if not isinstance(formula, TextFormula):
        return None
    points = [
        (kin, both)
        for kin in (ratios.draw("inside"), ratios.draw("any"), ratios.draw("complex"))
        if kin is not None and (both := ratios.both(kin)) is not None
    ]
    if len(points) < 2:
        return None
    for node, text in _variants(formula.node):
        changed = replace(formula, node=node)
        try:
            if all(ratios.same(ratios.ctx.convert(changed.quick(kin, 20)), both[1]) for kin, both in points):
                return Diagnosis("shifted argument", f"{text}; moved back, the formula is right where it was tried")
        except NO_VALUE:
            continue
    return None


# --- one channel, sines ---------------------------------------------------------------------------------------------


def _channels(ratios: Ratios) -> list[tuple[Channel, Affine]]:
    """Channels that differ on the locus by more than a sign and an integer."""
    found: list[tuple[Channel, Affine]] = []
    seen: set[tuple[Any, ...]] = set()
    planar = [d.channel for d in ratios.locus.divisors]
    for labels in dict.fromkeys([*planar, *ratios.locus.subsets()]):
        form = ratios.locus.reduced(ratios.locus.channel_form(labels))
        if not form.coefficients:
            continue
        keys = []
        for sign in (1, -1):
            part = form.times(Exact(sign))
            whole = part.constant.re - (part.constant.re // 1)
            keys.append((tuple(sorted((k, str(c)) for k, c in part.coefficients.items())), whole))
        if not seen & set(keys):
            seen.update(keys)
            found.append((labels, ratios.locus.channel_form(labels)))
    return found


def _one_channel(ratios: Ratios) -> Diagnosis | None:
    if len(ratios.locus.free) < 2:
        return None
    for labels, form in _channels(ratios):
        start = ratios.draw("inside")
        first = ratios.at(start)
        if start is None or first is None:
            continue
        pinned = [form - Affine(start.channel(labels))]
        others = [ratios.at(ratios.draw("any", pinned)) for _ in range(3)]
        known = [r for r in others if r is not None]
        if len(known) < 2 or not all(ratios.same(first, r) for r in known):
            continue
        return _named_function(ratios, labels)
    return None


def _named_function(ratios: Ratios, labels: Channel) -> Diagnosis:
    """The ratio is a function of one channel: is it a power of a sine, or a linear function?"""
    ctx, name = ratios.ctx, dotted(labels)
    points = ratios.sample(4, "any")
    values = [(ctx.mpf(kin.channel(labels).re.numerator) / kin.channel(labels).re.denominator, r) for kin, r in points]
    for power in (1, -1, 2, -2, 3, -3):
        rest = [r / ctx.sin(ctx.pi * x) ** power for x, r in values]
        if len(rest) > 2 and all(ratios.same(rest[0], r) for r in rest[1:]):
            text = _product_text(ratios, rest[0], [(name, power)])
            return Diagnosis("sines", f"the ratio formula/integral is {text}", labels)
    found = _affine(ratios)
    if found is not None:
        return found
    return Diagnosis("one channel", f"the ratio formula/integral depends on the channel {name} only", labels)


def _product_text(ratios: Ratios, constant: Big, powers: Sequence[tuple[str, int]]) -> str:
    factor = constant_text(ratios.ctx, constant, ratios.tolerance * 1000) or ratios.ctx.nstr(constant, 15)
    sines = " ".join(f"sin(pi X.{name})" + (f"^{k}" if k != 1 else "") for name, k in powers)
    return f"{factor} times {sines}"


def _sines(ratios: Ratios) -> Diagnosis | None:
    """Integer powers of sines from the logarithms of the moduli: a linear system."""
    ctx = ratios.ctx
    channels = _channels(ratios)
    count = len(channels) + 1
    points = [(kin, r) for kin, r in ratios.sample(count + 3, "any") if kin.is_real]
    if len(points) < count + 2:
        return None

    def sine(kin: Mandelstams, labels: Channel) -> Big:
        x = kin.channel(labels).re
        return ctx.sin(ctx.pi * ctx.mpf(x.numerator) / x.denominator)

    rows = [[ctx.one, *(ctx.log(abs(sine(kin, c))) for c, _ in channels)] for kin, _ in points]
    logs = [ctx.log(abs(r)) for _, r in points]
    try:
        solution = ctx.lu_solve(ctx.matrix(rows[:count]), ctx.matrix(logs[:count]))
    except ZeroDivisionError:
        return None
    powers = [int(ctx.nint(x)) for x in list(solution)[1:]]
    if not any(powers) or max(map(abs, powers)) > 6:
        return None
    rest = []
    for kin, ratio in points:
        for (labels, _), power in zip(channels, powers, strict=True):
            ratio /= sine(kin, labels) ** power
        rest.append(ratio)
    if not all(ratios.same(rest[0], r) for r in rest[1:]):
        return None
    named = [(dotted(c), k) for (c, _), k in zip(channels, powers, strict=True) if k]
    only = next(c for (c, _), k in zip(channels, powers, strict=True) if k) if len(named) == 1 else None
    return Diagnosis("sines", f"the ratio formula/integral is {_product_text(ratios, rest[0], named)}", only)


# --- rational factors and poles -------------------------------------------------------------------------------------


def _affine(ratios: Ratios) -> Diagnosis | None:
    """The ratio or its inverse is a linear function: a zero that removes a pole, or a pole that was put in."""
    ctx = ratios.ctx
    count = len(ratios.locus.free) + 1
    points = ratios.sample(count + 2, "any")
    if len(points) < count + 2:
        return None
    rows = [
        [ctx.one, *(ctx.mpf(x.re.numerator) / x.re.denominator for x in ratios.locus.coordinates(kin))]
        for kin, _ in points
    ]
    for inverse in (False, True):
        values = [1 / r if inverse else r for _, r in points]
        try:
            solution = list(ctx.lu_solve(ctx.matrix(rows[:count]), ctx.matrix(values[:count])))
        except ZeroDivisionError:
            return None
        predicted = [sum((a * b for a, b in zip(solution, row, strict=True)), ctx.zero) for row in rows]
        close = [abs(p - v) <= 1000 * ratios.tolerance * (1 + abs(v)) for p, v in zip(predicted, values, strict=True)]
        if all(close) and any(abs(x) > ctx.mpf("1e-6") for x in solution[1:]):
            return _linear_factor(ratios, solution, inverse)
    return None


def _linear_factor(ratios: Ratios, solution: Sequence[Big], inverse: bool) -> Diagnosis:
    exact = [read(ratios.ctx.re(x), "coefficient")[0].re.limit_denominator(1000) for x in solution]
    slopes = {k: Exact(c) for k, c in zip(ratios.locus.free, exact[1:], strict=True) if c}
    word = "has a pole that the integral has not" if inverse else "misses a pole of the integral"
    divisors = {d.channel: d.offset for d in ratios.locus.divisors}
    for labels in dict.fromkeys([*divisors, *ratios.locus.subsets()]):
        form = ratios.locus.reduced(ratios.locus.channel_form(labels))
        if set(form.coefficients) != set(slopes) or not slopes:
            continue
        scale = {slopes[k] / form.coefficients[k] for k in slopes}
        if len(scale) != 1:
            continue
        shift = Exact(exact[0]) / scale.pop() - form.constant  # the zero is at X = -shift
        name = dotted(labels)
        level = int(shift.re) - divisors.get(labels, 0) if shift.is_integer else None
        at = f"X.{name} = {-shift}"
        if not inverse and labels in divisors and level == 0:
            text = f"as if a Gamma function of X.{name} had its argument shifted by one: it {word}, at {at} (level 0)"
            return Diagnosis("shifted argument", f"the formula is off by the factor X.{name}, {text}", labels, 0)
        more = f" (level {level})" if level is not None else ""
        return Diagnosis("pole", f"the formula {word}, in the channel {name} at {at}{more}", labels, level)
    return Diagnosis("pole", f"the formula {word}: the ratio is {'one over ' if inverse else ''}a linear function")


def _difference(ratios: Ratios) -> Diagnosis | None:
    """Formula - integral is a constant, or a single pole in one channel with a constant residue."""
    ctx = ratios.ctx
    points = [kin for kin in (ratios.draw(kind) for kind in ("inside", "inside", "any", "any")) if kin is not None]
    found = [(kin, both[0] - both[1]) for kin in points if (both := ratios.both(kin)) is not None]
    if len(found) < 3 or not all(d for _, d in found):
        return None
    loose = ratios.tolerance * 10**4  # the difference is smaller than its members
    if all(abs(d - found[0][1]) <= loose * abs(d) for _, d in found):
        name = constant_text(ctx, found[0][1], loose) or ctx.nstr(found[0][1], 15)
        return Diagnosis("added term", f"the formula is the integral plus {name}")
    divisors = {d.channel: d.offset for d in ratios.locus.divisors}
    for labels in dict.fromkeys([*divisors, *ratios.locus.subsets()]):
        for at in range(-3, 4):
            values = [d * rounded(ctx, kin.channel(labels) - at) for kin, d in found]
            if not values[0] or not all(abs(v - values[0]) <= loose * abs(values[0]) for v in values[1:]):
                continue
            level = -at - divisors.get(labels, 0)
            name = constant_text(ctx, values[0], loose) or ctx.nstr(values[0], 15)
            text = f"the formula is the integral plus a pole in the channel {dotted(labels)}, {name} / (X - ({at}))"
            if labels in divisors and level >= 0:
                return Diagnosis("pole", f"{text}: its residue at level {level} is wrong", labels, level)
            return Diagnosis("pole", f"{text}, where the integral has none", labels, level)
    return None


def _poles(ratios: Ratios) -> Diagnosis | None:
    """Growth of both sides towards the places where either may have a pole."""
    divisors = {d.channel: d.offset for d in ratios.locus.divisors}
    levels = (0, 1, 2, -1, -2) if ratios.locus.n < 6 else (0, 1, -1)
    for labels in dict.fromkeys([*divisors, *ratios.locus.subsets()]):
        offset = divisors.get(labels, 0)
        form = ratios.locus.channel_form(labels)
        if not ratios.locus.reduced(form).coefficients:
            continue
        for level in levels:
            orders = _orders(ratios, form, -offset - level)
            if orders is None or orders[0] == orders[1] or _orders(ratios, form, -offset - level) != orders:
                continue
            mine, true = orders
            name = dotted(labels)
            word = "misses a pole of the integral" if mine < true else "has a pole that the integral has not"
            more = f" (level {level})" if labels in divisors else ""
            return Diagnosis(
                "pole",
                f"the formula {word}, in the channel {name} at X.{name} = {-offset - level}{more}",
                labels,
                level,
            )
    return None


def _orders(ratios: Ratios, form: Affine, at: int) -> tuple[int, int] | None:
    """The orders of the poles of formula and integral where the form has a value."""
    near = ratios.locus.near(form, ratios.rng, Fraction(at) + Fraction(1, 10**4 + 7))
    if near is None:
        return None
    # the same point, but for the distance: pin the other free invariants
    closer = None
    for k in range(len(ratios.locus.free)):
        pins = [
            ratios.locus.channel_form(ratios.locus.basis[f]) - Affine(near.channel(ratios.locus.basis[f]))
            for m, f in enumerate(ratios.locus.free)
            if m != k
        ]
        closer = ratios.draw("any", [form - Affine(Exact(Fraction(at) + Fraction(1, 10**6 + 3))), *pins])
        if closer is not None:
            break
    first, second = ratios.both(near), None if closer is None else ratios.both(closer)
    if first is None or second is None:
        return None
    ctx = ratios.ctx
    grown = []
    for a, b in zip(first, second, strict=True):
        if not a or not b:
            return None
        grown.append(int(ctx.nint(ctx.log10(abs(b / a)) / 2)))
    return max(grown[0], 0), max(grown[1], 0)
