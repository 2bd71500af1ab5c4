"""Right formulas and wrong ones with a known mistake: what the examination of formulas is measured by.

    python tests/calibration/planted_formulas.py

runs all of them and prints the score; test_planted_formulas.py runs a sample.  Right formulas come from published
closed forms (sources beside them); every wrong one is a right one with a single planted mistake.
"""

from __future__ import annotations

import time
from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass, field

import kn_integrate as kn
from kn_integrate.checks.examine import Examination, examine_formula
from kn_integrate.integrals import shifted_exponents


@dataclass(frozen=True)
class Planted:
    """A formula; ``kinds`` are the acceptable names of its mistake, none for a right one."""

    formula: str
    spec: kn.DiskIntegral | kn.SphereIntegral
    where: Mapping[str, str] = field(default_factory=dict)
    parameters: Mapping[str, str] = field(default_factory=dict)
    kinds: tuple[str, ...] = ()

    def examine(self, trials: int = 24) -> Examination:
        return examine_formula(
            self.formula, self.spec, where=self.where, parameters=self.parameters, trials=trials, rng=11
        )


def disk(*order: int, f: kn.Integrand | None = None, domain: tuple[int, ...] | None = None) -> kn.DiskIntegral:
    return kn.DiskIntegral(len(order), kn.parke_taylor(*order) if f is None else f, domain)


ONE = kn.monomial({})
D4, D5, D6 = disk(1, 2, 3, 4), disk(1, 2, 3, 4, 5), disk(1, 2, 3, 4, 5, 6)
T4, T5, T6 = (disk(*range(1, n + 1), f=ONE) for n in (4, 5, 6))
S4 = kn.SphereIntegral(4, kn.parke_taylor(1, 2, 3, 4))

B4 = "beta(s12,s23)"
# int of the five-point disk as a 3F2 at one: Bardakci and Ruegg 1968, DLMF 16.5.2
R5 = "beta({45},{34})*beta({12},{23})*hyp3f2({45},{12},{23}+{34}-{15};{45}+{34},{12}+{23};1)"
PLANAR5 = ("12", "23", "34", "45", "15")


def five(shifts: Mapping[str, int] | None = None, turn: int = 0) -> str:
    """The five-point formula with labels turned and planar invariants shifted."""
    names = {}
    for pair in PLANAR5:
        labels = sorted((int(c) - 1 + turn) % 5 + 1 for c in pair)
        name = "".join(map(str, labels))
        shift = (shifts or {}).get(name, 0)
        names[pair] = f"(s{name}+{shift})" if shift else f"s{name}"
    return five_with(names)


def five_with(names: Mapping[str, str]) -> str:
    """The five-point formula with its planar invariants named as given."""
    text = R5
    for pair, name in names.items():
        text = text.replace("{" + pair + "}", name)
    return text


def five_of(q: tuple[int, ...]) -> str:
    """Z_12345(PT(q)): the monomial shifts the kinematics."""
    powers = {}
    sign = 1
    for a, b in zip(q, (*q[1:], q[0]), strict=True):
        powers[min(a, b), max(a, b)] = -1
        sign = -sign if a > b else sign
    outer, shifts = shifted_exponents((1, 2, 3, 4, 5), powers)
    moved = {p: shifts[int(p[0]), int(p[1])] for p in PLANAR5}
    return ("-" if outer * sign < 0 else "") + five(moved)  # (-1)^(n-1) = 1


DIXON = (  # DLMF 16.4.4
    "beta(b,s34)*beta(c,s23)*gamma(1+a/2)*gamma(1+a/2-b-c)*gamma(1+a-b)*gamma(1+a-c)"
    "/(gamma(1+a)*gamma(1+a-b-c)*gamma(1+a/2-b)*gamma(1+a/2-c))"
)
WATSON = (  # DLMF 16.4.6
    "beta(b,s34)*beta(c,s23)*pi^(1/2)*gamma(c+1/2)*gamma((a+b+1)/2)*gamma(c+(1-a-b)/2)"
    "/(gamma((a+1)/2)*gamma((b+1)/2)*gamma(c+(1-a)/2)*gamma(c+(1-b)/2))"
)
WHIPPLE = (  # DLMF 16.4.7
    "beta(b,s34)*beta(c,s23)*pi*2^(1-2*c)*gamma(e)*gamma(f)"
    "/(gamma((a+e)/2)*gamma((a+f)/2)*gamma((1-a+e)/2)*gamma((1-a+f)/2))"
)
ABC = {"a": "-s24", "b": "s45", "c": "s12"}
CHAIN6 = "beta(s12,s23)*beta(X.1.2.3,s34)*beta(s56,s45)"
SELBERG5 = "gamma(al)*gamma(be)*gamma(al+g)*gamma(be+g)*gamma(1+2*g)/(2*gamma(al+be+g)*gamma(1+g)*gamma(al+be+2*g))"
SELBERG6 = (  # Selberg 1944, DLMF 5.14.4, divided by 3!
    "gamma(al)*gamma(be)*gamma(al+g)*gamma(be+g)*gamma(al+2*g)*gamma(be+2*g)*gamma(1+2*g)*gamma(1+3*g)"
    "/(6*gamma(al+be+2*g)*gamma(al+be+3*g)*gamma(al+be+4*g)*gamma(1+g)^2)"
)
AL_BE_G = {"al": "s12+1", "g": "s23/2"}
W5 = {"s13": "s12", "s34": "s24"}
W6 = {"s13": "s12", "s14": "s12", "s35": "s25", "s45": "s25", "s24": "s23", "s34": "s23"}
# Dixon 1905, Anderson 1991 (review: Forrester and Warnaar 2008)
ANDERSON = "gamma(t)*gamma(u)*gamma(v)/gamma(t+u+v)*beta(t+u+s13,u+v+s35)"
WA = {"s14": "s12", "s34": "s23", "s45": "s25", "s24": "1"}
PA = {"t": "s12+1", "u": "s23+1", "v": "s25+1"}
# complex beta: Shapiro 1969, Virasoro 1969 (common knowledge)
SPHERE4 = "gamma(s12)*gamma(s23)*gamma(1-s12-s23)/(gamma(1-s12)*gamma(1-s23)*gamma(s12+s23))"


def right() -> list[Planted]:
    found = [
        Planted(B4, D4),
        Planted("gamma(a)*gamma(b)/gamma(a+b)", D4, {}, {"a": "s12", "b": "s23"}),
        Planted("hyp2f1(s12,1-s23,1+s12,1)/s12", D4),  # converges only for Re s23 > 0
        Planted("pi/sin(pi*s12)*gamma(s23)/(gamma(1-s12)*gamma(s12+s23))", D4),
        Planted("(1/s12+1/s23)*gamma(1+s12)*gamma(1+s23)/gamma(1+s12+s23)", D4),
        Planted("-beta(s12,s23+1)", disk(1, 2, 4, 3)),
        Planted("beta(s12+1,s23+1)", T4),
        Planted("beta(s12,s13)", disk(2, 1, 3, 4, domain=(2, 1, 3, 4))),
        Planted("beta(s12-1,s23+1)", disk(1, 2, 3, 4, f=kn.monomial({(1, 2): -2, (3, 4): -2}))),
        Planted("beta(s12,s12)", D4, {"s12": "s23"}),
        Planted("2^(1-2*s12)*beta(s12,1/2)", D4, {"s12": "s23"}),
        Planted("pi/sin(pi*s12)", D4, {"s12+s23": "1"}),
        Planted("1/s12", D4, {"s23": "1"}),
        Planted("1/(s12*(s12+1))", D4, {"s23": "2"}),
        Planted(SPHERE4, S4),
        Planted("gamma(a)^2*gamma(1-2*a)/(gamma(1-a)^2*gamma(2*a))", S4, {"s12": "s23"}, {"a": "s12"}),
        *(Planted(five(turn=k), D5) for k in range(5)),
        Planted(five().replace("hyp3f2(", "pFq("), D5),
        *(Planted(five_of(q), disk(*q)) for q in ((1, 2, 3, 5, 4), (1, 3, 2, 4, 5), (1, 3, 5, 2, 4))),
        Planted(five(dict.fromkeys(PLANAR5, 1)), T5),
        Planted("beta(s45,s34)*beta(s12,s23)", D5, {"s24": "0"}),
        Planted("beta(s45,s34)*beta(s12,s23)", D5, {"s23+s34": "s15"}),
        Planted(
            "beta(s45,s34)*beta(s12,s23)*gamma(s12+s23)*gamma(s23-s45)/(gamma(s23)*gamma(s12+s23-s45))",
            D5,
            {"s24": "-s34-s45"},
        ),  # DLMF 15.4.20
        Planted(DIXON, D5, {"b+s34": "1+a-b", "c+s23": "1+a-c"}, ABC),
        Planted(WATSON, D5, {"b+s34": "(a+b+1)/2", "s23": "c"}, ABC),
        Planted(WHIPPLE, D5, {"a+b": "1", "e+f": "1+2*c"}, {**ABC, "e": "s45+s34", "f": "s12+s23"}),
        Planted(SELBERG5, T5, W5, {**AL_BE_G, "be": "s24+1"}),
        Planted(CHAIN6, D6, {"s24": "0", "s25": "0", "s35": "0"}),
        Planted(CHAIN6 + "*pFq(-s25,s12,X.1.2.3,s56;s12+s23,X.1.2.3+s34,s56+s45;1)", D6, {"s24": "0", "s35": "0"}),
        Planted(CHAIN6 + "*hyp3f2(-s24,s12,X.1.2.3;s12+s23,X.1.2.3+s34;1)", D6, {"s25": "0", "s35": "0"}),
        Planted(SELBERG6, T6, W6, {**AL_BE_G, "be": "s25+1"}),
        Planted(ANDERSON, T6, WA, PA),
    ]
    return found


def wrong() -> list[Planted]:
    bases = [  # formula, integral, locus, parameters, an invariant, the same less its first pole
        (Planted(B4, D4), "s12", "s12"),
        (Planted("beta(s12+1,s23+1)", T4), "s12", "(s12+1)"),
        (Planted(SPHERE4, S4), "s12", "s12"),
        (Planted(five(), D5), "s12", "s12"),
        (Planted("beta(s45,s34)*beta(s12,s23)", D5, {"s24": "0"}), "s45", "s45"),
        (Planted(SELBERG5, T5, W5, {**AL_BE_G, "be": "s24+1"}), "s12", "(s12+1)"),
        (Planted(CHAIN6, D6, {"s24": "0", "s25": "0", "s35": "0"}), "s23", "s23"),
        (Planted(ANDERSON, T6, WA, PA), "s12", "(s12+1)"),
    ]
    mistakes = [
        ("-2/3*pi^2*({F})", "constant"),
        ("-({F})", "constant"),
        ("({F})*sin(pi*{x})", "sines"),
        ("({F})*sin(pi*s23)/sin(pi*{x})^2", "sines"),
        ("({F})*exp(i*pi*{x})", "one channel"),
        ("({F})*({x}+1/3)/({x}-1/5)", "one channel"),
        ("({F})*({y}+1)", "pole"),
        ("({F})+1/({y}+1)", "pole"),
        ("({F})/({x}-1)", "pole"),
        ("({y}^2)^(1/2)/{y}*({F})", "continuation"),
        ("({F})*log(exp(30*{x}))/(30*{x})", "complex"),
        ("({F})+1/7", "added term"),
    ]
    found = []
    for base, x, y in bases:
        for text, kind in mistakes:
            if x == "s23" and "s23" in text:
                text = text.replace("s23", "s34")
            formula = text.format(F=base.formula, x=x, y=y)
            found.append(Planted(formula, base.spec, base.where, base.parameters, (kind,)))

    def add(kind: str, spec: kn.DiskIntegral | kn.SphereIntegral, formula: str, like: Planted | None = None) -> None:
        found.append(Planted(formula, spec, like.where if like else {}, like.parameters if like else {}, (kind,)))

    shifted = "shifted argument"
    add(shifted, D4, "gamma(s12+1)*gamma(s23)/gamma(s12+s23)")
    add(shifted, D4, "gamma(s12)*gamma(s23)/gamma(s12+s23+1/2)")
    add(shifted, T4, "beta(s12+1,s23)")
    add(shifted, S4, SPHERE4.replace("1-s12-s23", "2-s12-s23"))
    add(shifted, D5, five().replace("s12+s23;1", "s12+s23+1;1"))
    add(shifted, D5, five().replace("beta(s45", "beta(s45-1"))
    add(shifted, T5, SELBERG5.replace("gamma(be+g)", "gamma(be+g+1)"), bases[5][0])
    add(shifted, D6, CHAIN6.replace("s34", "s34+1"), bases[6][0])
    add(shifted, T6, ANDERSON.replace("u+v+s35", "u+v+s35-1"), bases[7][0])
    add(shifted, D5, DIXON.replace("gamma(1+a/2-b)", "gamma(2+a/2-b)"), Planted("", D5, right_locus(), ABC))
    other = "other integral"
    add(other, D4, "beta(s12,s13)")
    add(other, D4, "beta(s13,s23)")
    add(other, D5, five_of((1, 2, 3, 5, 4)))
    add(other, D5, five_of((1, 3, 2, 4, 5)))
    add(other, disk(1, 2, 4, 3, 5), five())
    add(other, D5, five_with({"12": "s13", "23": "s23", "34": "s24", "45": "s45", "15": "s15"}))
    add(other, D5, five_with({"12": "s12", "23": "s34", "34": "s23", "45": "s45", "15": "s15"}))
    return found


def right_locus() -> dict[str, str]:
    return {"b+s34": "1+a-b", "c+s23": "1+a-c"}


def main() -> None:
    tally: Counter[str] = Counter()
    slowest = 0.0
    for planted in (*right(), *wrong()):
        start = time.perf_counter()
        result = planted.examine()
        seconds = time.perf_counter() - start
        slowest = max(slowest, seconds)
        if not planted.kinds:
            tally["right"] += 1
            tally["right accepted"] += result.agrees
            good = result.agrees
        else:
            tally["wrong"] += 1
            tally["wrong rejected"] += result.verdict == "disagrees"
            good = result.kind in planted.kinds and result.verdict == "disagrees"
            tally["kind named"] += good
        head = f"{'ok' if good else 'MISSED'} {seconds:.1f} s, n={planted.spec.n}, {'/'.join(planted.kinds) or 'right'}"
        print(f"{head}: {planted.formula}" + ("" if good else f" -> {result.kind}: {result}"), flush=True)
    for name, count in tally.items():
        print(f"{name}: {count}")
    print(f"slowest: {slowest:.1f} s")


if __name__ == "__main__":
    main()
