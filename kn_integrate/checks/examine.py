"""Is this formula the integral?  Values at random exact points of the locus on which it is claimed, and a diagnosis.

Agreement at finitely many points is evidence, not proof.  It is strong evidence for meromorphic functions that are
compared beyond convergence and at complex points too, where a formula that is right only by accident has to fail.
"""

from __future__ import annotations

import random
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

from ..closed_forms.working import context
from ..errors import InputError, NotAvailableError, PoleError, WorkLimitError
from ..exact import read_integer
from ..integrals import DiskIntegral, SphereIntegral
from ..kinematics import Mandelstams
from .expression import Affine, OutOfRangeError, UndefinedValueError
from .formulas import Formula, Measured, read_formula
from .sampling import KINDS, Locus, job_text

EVIDENCE = "numerical agreement is evidence, not proof"
Source = Callable[[DiskIntegral | SphereIntegral, Mandelstams, int], Measured]


@dataclass(frozen=True)
class Trial:
    """One point: the integral and the formula.

    Attributes
    ----------
    kin : Mandelstams
    region : str
        ``"inside"``, ``"continued"``, ``"complex"`` or ``"complex continued"``.
    integral, formula : Measured or None
        With error bounds; None where there is no value.
    verdict : str
        ``"agrees"``, ``"disagrees"`` or ``"undecided"``.
    digits : float
        Decimal digits to which the two agree.
    reason : str
        Why there is no value, or no decision.
    """

    kin: Mandelstams
    region: str
    integral: Measured | None
    formula: Measured | None
    verdict: str
    digits: float
    reason: str = ""


@dataclass(frozen=True)
class Examination:
    """The result of :func:`examine_formula`.

    Attributes
    ----------
    verdict : str
        ``"agrees"``, ``"disagrees"`` or ``"undecided"``.
    digits : float
        The least agreement, in decimal digits, over the points that agree; 0 when there are none.
    trials : tuple of Trial
    kind : str
        What is wrong: ``"constant"``, ``"sines"``, ``"one channel"``, ``"shifted argument"``, ``"complex"``,
        ``"continuation"``, ``"pole"``, ``"other integral"``, ``"unknown"``; empty when nothing is.
    diagnosis : str
        The same in a sentence.
    channel, level
        Of the pole or the ratio in question, where there is one.
    counterexample : str or None
        The simplest failing point found, as the text of a job file.
    """

    verdict: str
    digits: float
    trials: tuple[Trial, ...]
    kind: str = ""
    diagnosis: str = ""
    channel: tuple[int, ...] | None = None
    level: int | None = None
    counterexample: str | None = None

    @property
    def agrees(self) -> bool:
        """True only for the verdict "agrees": undecided is no agreement."""
        return self.verdict == "agrees"

    def counts(self) -> dict[str, int]:
        """Number of trials by verdict."""
        return {v: sum(t.verdict == v for t in self.trials) for v in ("agrees", "disagrees", "undecided")}

    def to_dict(self) -> dict[str, Any]:
        """Plain data."""
        return {
            "verdict": self.verdict,
            "agrees": self.agrees,
            "digits": round(self.digits, 1),
            "trials": self.counts(),
            "kind": self.kind,
            "diagnosis": self.diagnosis,
            "channel": None if self.channel is None else list(self.channel),
            "level": self.level,
            "counterexample": self.counterexample,
            "note": EVIDENCE,
        }

    def __str__(self) -> str:
        counts = ", ".join(f"{count} {name}" for name, count in self.counts().items() if count)
        text = f"{self.verdict} ({len(self.trials)} points: {counts}"
        text += f"; to {self.digits:.0f} digits or more where it agrees)" if self.digits else ")"
        if self.diagnosis:
            text += f": {self.diagnosis}"
        return f"{text}; {EVIDENCE}"


def integral_value(spec: DiskIntegral | SphereIntegral, kin: Mandelstams, digits: int) -> Measured:
    """The integral to a number of digits, by whichever engine serves that."""
    if isinstance(spec, DiskIntegral):
        from ..api import disk_integral

        found = disk_integral(kin, spec, digits=digits)
    else:
        from ..sphere.evaluate import sphere_integral

        found = sphere_integral(kin, spec, digits=digits)
    return Measured(found.value, found.error)


def compare(integral: Measured, formula: Measured, digits: int, most: int | None) -> tuple[str, float]:
    """Verdict and digits of agreement of two measured numbers.

    Agreement needs both errors below the tolerance too; disagreement needs a gap well above both errors.
    """
    ctx = context(400)
    a, b = integral.number(ctx), formula.number(ctx)
    scale = max(abs(a), abs(b))
    if not ctx.isfinite(a) or not ctx.isfinite(b):
        return "undecided", 0.0
    # an error bound is a double: below its range it is not a statement
    errors = ctx.mpf(integral.error) + ctx.mpf(formula.error) + ctx.mpf(10) ** -300
    gap = abs(a - b)
    if not scale:
        return "agrees", float(digits)
    tolerance = scale * ctx.mpf(10) ** -(digits if most is None else min(digits, most))
    resolved = float(-ctx.log10(max(gap, errors, scale * ctx.mpf(10) ** -380) / scale))
    if gap <= tolerance and errors <= tolerance:
        return "agrees", resolved
    if gap > tolerance and gap > 10 * errors:
        return "disagrees", max(resolved, 0.0)
    return "undecided", max(resolved, 0.0)


class Laboratory:
    """Both sides of the question at any point: what trials and diagnosis share."""

    def __init__(
        self, spec: DiskIntegral | SphereIntegral, formula: Formula, locus: Locus, digits: int, source: Source
    ) -> None:
        self.spec = spec
        self.formula = formula
        self.locus = locus
        self.digits = digits
        self.source = source

    def region(self, kin: Mandelstams) -> str:
        """Where a point lies."""
        inside = self.locus.is_inside(kin)
        if kin.is_real:
            return "inside" if inside else "continued"
        return "complex" if inside else "complex continued"

    def trial(self, kin: Mandelstams) -> Trial:
        """Compare at a point; where that does not decide, again with more digits."""
        region = self.region(kin)
        trial = Trial(kin, region, None, None, "undecided", 0.0, "no value")
        for working in (self.digits + 6, 2 * self.digits + 10, 4 * self.digits + 20):
            try:
                integral = self.source(self.spec, kin, working)
            except (PoleError, WorkLimitError, NotAvailableError) as error:
                return Trial(kin, region, None, None, "undecided", 0.0, f"integral: {error}")
            try:
                formula = self.formula.at(kin, working)
            except UndefinedValueError as error:
                return Trial(kin, region, integral, None, "disagrees", 0.0, f"formula: {error}")
            except OutOfRangeError as error:
                return Trial(kin, region, integral, None, "undecided", 0.0, f"formula: {error}")
            verdict, digits = compare(integral, formula, self.digits, formula.most)
            reason = "errors too large to decide" if verdict == "undecided" else ""
            trial = Trial(kin, region, integral, formula, verdict, digits, reason)
            if verdict != "undecided":
                break
        return trial


def _near_pole(locus: Locus, rng: random.Random) -> Mandelstams | None:
    divisors = [d for d in locus.divisors if locus.reduced(locus.channel_form(d.channel)).coefficients]
    if not divisors:
        return None
    divisor = rng.choice(divisors)
    level = rng.choice((0, 0, 1, 2))
    distance = Fraction(rng.choice((-1, 1)) * rng.randint(1, 9), 10007) - divisor.offset - level
    return locus.near(locus.channel_form(divisor.channel), rng, distance)


def _point(locus: Locus, kind: str, rng: random.Random) -> Mandelstams | None:
    found = _near_pole(locus, rng) if kind == "near pole" else locus.draw(kind, rng)
    return found or locus.draw("any", rng)


def examine_formula(
    formula: str | Callable[[Any], Any],
    spec: DiskIntegral | SphereIntegral,
    *,
    where: Mapping[str, Any] | None = None,
    parameters: Mapping[str, Any] | None = None,
    trials: int = 40,
    rng: int = 7,
    digits: int = 20,
    source: Source = integral_value,
) -> Examination:
    """Compare a formula with an integral at random exact kinematics, and say how it is wrong if it is.

    Parameters
    ----------
    formula
        Text in the language of :mod:`.expression`, such as ``"gamma(s12)*gamma(s23)/gamma(s12+s23)"``; or a function
        of a :class:`.formulas.Point`.
    spec
        The integral.
    where
        Linear conditions ``{left: right}``: the formula is claimed, and examined, only where they hold.
    parameters
        Names for linear combinations of the invariants, ``{"a": "s12+s23"}``.
    trials
        Number of points: inside convergence, beyond it, near poles, and complex ones.
    rng
        Seed.
    digits
        Decimal digits to which the two must agree.  A function that returns double precision is held to 10.
    source
        Computes the integral; for experiments.

    Returns
    -------
    Examination
        Agreement is evidence, not proof.  One failing point makes the verdict "disagrees"; one that cannot be decided
        makes it "undecided" at best.

    Raises
    ------
    InputError
        For text outside the language (with the position), conditions that are not linear or contradict each other.

    Examples
    --------
    >>> import kn_integrate as kn
    >>> from kn_integrate.checks.examine import examine_formula
    >>> spec = kn.DiskIntegral(4, kn.parke_taylor(1, 2, 3, 4))
    >>> examine_formula("beta(s12, s23)", spec, trials=8).verdict
    'agrees'
    >>> examine_formula("2*pi*beta(s12, s23)", spec, trials=8).diagnosis
    'the formula is the integral times 2*pi at every point'
    """
    from .diagnosis import diagnose

    if not isinstance(spec, (DiskIntegral, SphereIntegral)):
        raise InputError("spec", type(spec).__name__, "a DiskIntegral or SphereIntegral")
    seed = read_integer(rng, "rng", "an integer seed")
    count = read_integer(trials, "trials")
    wanted = read_integer(digits, "digits")
    if not 1 <= count <= 10_000:
        raise InputError("trials", str(count), "between 1 and 10000")
    if not 5 <= wanted <= 200:
        raise InputError("digits", str(wanted), "between 5 and 200")
    for name, given in (("where", where), ("parameters", parameters)):
        if given is not None and not isinstance(given, Mapping):
            raise InputError(name, type(given).__name__, "a mapping")
    locus = Locus(spec, where or {}, parameters or {})
    lab = Laboratory(spec, read_formula(formula, locus), locus, wanted, source)
    generator = random.Random(seed)
    found: list[Trial] = []
    for k in range(count):
        kin = _point(locus, KINDS[k % len(KINDS)], generator)
        if kin is None:
            raise InputError("where", "a locus on which no moderate point was found", "conditions that leave room")
        found.append(lab.trial(kin))
    bad = [t for t in found if t.verdict == "disagrees"]
    good = [t.digits for t in found if t.verdict == "agrees"]
    least = min(good, default=0.0)
    if bad:
        what = diagnose(lab, tuple(found), random.Random(seed + 1))
        example = _counterexample(lab, bad, random.Random(seed + 2))
        return Examination("disagrees", least, tuple(found), what.kind, what.text, what.channel, what.level, example)
    undecided = [t for t in found if t.verdict == "undecided"]
    if undecided:
        return Examination("undecided", least, tuple(found), "", f"no decision: {undecided[0].reason}")
    return Examination("agrees", least, tuple(found))


def _height(kin: Mandelstams) -> tuple[int, int]:
    parts = [part for x in kin.pairs for part in x.as_ratio()]
    return (0 if kin.is_real else 1, sum(part.bit_length() for part in parts))


def _counterexample(lab: Laboratory, bad: list[Trial], rng: random.Random) -> str:
    """The failing point with the smallest numbers: among the trials, and simple points of the same regions."""
    best = min(bad, key=lambda t: _height(t.kin))
    locus = lab.locus
    candidates = []
    for denominator in (2, 3, 5, 7):
        for _ in range(6):
            kin = simple_point(locus, rng, denominator)
            if kin is not None and lab.region(kin) == best.region:
                candidates.append(kin)
    for kin in sorted(candidates, key=_height)[:4]:
        if _height(kin) >= _height(best.kin):
            break
        trial = lab.trial(kin)
        if trial.verdict == "disagrees" and trial.digits < 15:
            best = trial
            break
    comments = [f"integral: {_shown(best.integral)}", f"formula:  {_shown(best.formula)}"]
    return job_text(lab.spec, best.kin, comments)


def simple_point(locus: Locus, rng: random.Random, denominator: int) -> Mandelstams | None:
    """A point whose free invariants are multiples of 1/denominator."""
    extra = [Affine() + locus.channel_form(locus.basis[k]) - Affine(_part(rng, denominator)) for k in locus.free]
    return locus.draw("any", rng, extra)


def _part(rng: random.Random, denominator: int) -> Any:
    from ..exact import Exact

    return Exact(Fraction(rng.randint(-denominator, 2 * denominator), denominator))


def _shown(number: Measured | None) -> str:
    return "no value" if number is None else number.text()
