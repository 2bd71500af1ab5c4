"""Recompute tests/data/published_values.json from the closed forms of the package: ``python make_published_values.py``.

Values are written to 30 digits.  The two entries that no closed form covers are computed here by quadrature of another
kind (see ``two_gauss_series`` and ``sector_sum``), the first to 30 digits, the second to 20.
"""

from __future__ import annotations

import json
import sys
from collections.abc import Sequence
from fractions import Fraction
from itertools import combinations
from math import prod
from pathlib import Path
from typing import Any

import mpmath

HERE = Path(__file__).parent
sys.path.insert(0, str(HERE.parent / "published"))

from massless import big, cycle_sign, in_order, j_value, massless_pairs, shifted, z_term  # noqa: E402
from sector_sum import BIG, sector_sum  # noqa: E402

from kn_integrate.closed_forms import (  # noqa: E402
    AomotoInsertion,
    BetaProduct,
    ComplexBeta,
    ComplexSelberg,
    Dixon,
    DixonAnderson,
    EulerBeta,
    FivePoint,
    Gauss,
    HypergeometricChain,
    PairExponents,
    PfaffSaalschuetz,
    RogersDougall,
    Selberg,
    Watson,
    Whipple,
    find,
    find_sphere,
)
from kn_integrate.exact import Exact, read  # noqa: E402

DIGITS = 30
WORK = 45

Planar = dict[str, str]
FIVE = {"1.2": "3/10", "2.3": "2/5", "3.4": "1/2", "4.5": "7/20", "5.1": "9/20"}
FOUR = {"1.2": "1/3", "2.3": "1/5"}
MIXED = {"1.2": "3/10", "2.3": "-7/13", "3.4": "5/11", "4.5": "2/7", "5.1": "9/17"}
SIX = {
    "1.2": "3/10",
    "2.3": "2/5",
    "3.4": "1/2",
    "4.5": "7/20",
    "5.6": "11/25",
    "6.1": "13/30",
    "1.2.3": "9/20",
    "2.3.4": "3/8",
    "3.4.5": "5/12",
}


def exact(value: Any) -> Exact:
    return read(value, "value")[0]


def text_of(value: Any, digits: int) -> str | list[str]:
    """The value rounded to the digits; a complex one as [re, im], digits relative to the modulus."""
    with mpmath.workdps(WORK + 20):
        if isinstance(value, mpmath.mpc) and value.imag != 0:
            parts = []
            for part in (value.real, value.imag):
                lost = max(0, int(mpmath.floor(mpmath.log10(abs(value) / abs(part))))) if part else 0
                parts.append(mpmath.nstr(part, max(1, digits - lost), strip_zeros=False))
            return parts
        return mpmath.nstr(mpmath.re(value), digits, strip_zeros=False)


def table(pairs: PairExponents) -> dict[str, str]:
    keys = combinations(range(1, pairs.n + 1), 2)
    return {f"{i}.{j}": str(x) for (i, j), x in zip(keys, pairs.flat, strict=True)}


def disk(name: str, terms: Sequence[tuple[Any, PairExponents]], source: str, **more: Any) -> dict[str, Any]:
    """An entry whose value is sum coefficient x integral, each integral by the first closed form that applies."""
    value = more.pop("value", None)
    if value is None:
        with mpmath.workdps(WORK):
            value = sum(big(exact(c)) * find(pairs)[0].form.value(WORK) for c, pairs in terms)
    digits = more.pop("digits", DIGITS)
    listed = [{"coefficient": str(exact(c)), "pairs": table(pairs)} for c, pairs in terms]
    return {
        "id": name,
        "kind": "disk",
        "n": terms[0][1].n,
        "terms": listed,
        "value": text_of(value, digits),
        "digits": digits,
        "source": source,
        **more,
    }


def form(name: str, closed: Any, **more: Any) -> dict[str, Any]:
    """An entry for one closed form, evaluated by that very formula."""
    value = closed.value(WORK)
    return disk(name, [(1, closed.pairs())], closed.source, value=value, **more)


def sphere(
    name: str, coefficient: Any, left: PairExponents, right: PairExponents, source: str, **more: Any
) -> dict[str, Any]:
    value = more.pop("value", None)
    if value is None:
        with mpmath.workdps(WORK):
            value = big(exact(coefficient)) * find_sphere(left, right)[0].value(WORK)
    term = {"coefficient": str(exact(coefficient)), "left": table(left), "right": table(right)}
    return {
        "id": name,
        "kind": "sphere",
        "n": left.n,
        "terms": [term],
        "value": text_of(value, DIGITS),
        "digits": DIGITS,
        "source": source,
        **more,
    }


def pairs_of(planar: Planar) -> dict[tuple[int, int], Exact]:
    keys = {tuple(map(int, key.split("."))): value for key, value in planar.items()}
    return massless_pairs({2: 4, 5: 5, 9: 6}[len(keys)], keys)


def z_entry(name: str, planar: Planar, ordering: Sequence[int], cycle: Sequence[int], **more: Any) -> dict[str, Any]:
    n = len(ordering)
    source = more.pop("source", EulerBeta.source if n == 4 else FivePoint.source)
    kinematics = {"planar": planar, "ordering": list(ordering), "integrands": [list(cycle)]}
    return disk(name, [z_term(pairs_of(planar), ordering, cycle)], source, **kinematics, **more)


def j_entry(name: str, planar: Planar, cycle: Sequence[int], other: Sequence[int]) -> dict[str, Any]:
    n = len(cycle)
    labels = range(1, n + 1)
    sign = cycle_sign(cycle, labels) * cycle_sign(other, labels)
    s = pairs_of(planar)
    left, right = (in_order(shifted(s, c), labels) for c in (cycle, other))
    with mpmath.workdps(WORK):
        value = j_value(s, cycle, other, WORK)
    return sphere(
        name,
        sign,
        left,
        right,
        "Kawai, Lewellen, Tye 1986 with the disk values of DLMF 5.12.1 and 16.5.2",
        value=value,
        planar=planar,
        integrands=[list(cycle), list(other)],
    )


def kernel_entry(name: str, planar: Planar, left: Sequence[int], right: Sequence[int], value: Any) -> dict[str, Any]:
    return {
        "id": name,
        "kind": "inverse_kernel",
        "n": len(left),
        "planar": planar,
        "integrands": [list(left), list(right)],
        "value": text_of(value, DIGITS),
        "digits": DIGITS,
        "source": "Mizera, arXiv:1610.04230, arXiv:1706.08527",
    }


# The two entries without a closed form


def two_gauss_series(pairs: PairExponents) -> Any:
    """n = 6 without a factor (1 - u_1 u_2 u_3): the integral over u_2 of a product of two 2F1 (DLMF 15.6.1)."""
    from kn_integrate.closed_forms import Cubical

    cubical = Cubical.of(pairs)
    long = dict(cubical.long)
    assert (1, 3) not in long
    with mpmath.workdps(WORK):
        a, c = ([big(x) for x in side] for side in (cubical.a, cubical.c))
        left, right = big(long[1, 2]), big(long[2, 3])

        def integrand(u: Any) -> Any:
            first = mpmath.hyp2f1(-left, a[0], a[0] + c[0], u)
            last = mpmath.hyp2f1(-right, a[2], a[2] + c[2], u)
            return u ** (a[1] - 1) * first * last

        # u = 1 - v^(1/c) removes the end-point power at 1; u itself is kept apart from 1 by the quadrature rule
        def mapped(v: Any) -> Any:
            return integrand(1 - v ** (1 / c[1])) / c[1]

        betas = mpmath.beta(a[0], c[0]) * mpmath.beta(a[2], c[2])
        return betas * mpmath.quad(mapped, [0, mpmath.mpf(1) / 2, 1])


# The list


def published_entries() -> list[dict[str, Any]]:
    entries: list[dict[str, Any]] = []
    add = entries.append
    finite = PairExponents.from_finite

    add(form("A1.beta.1", EulerBeta("2/5", "3/10")))
    add(z_entry("A2.5pt.1", FIVE, (1, 2, 3, 4, 5), (1, 2, 3, 4, 5)))
    loci = {
        "dixon": (Dixon, {(1, 2): "-0.83", (2, 3): "-0.04", (3, 4): "-0.12", (2, 4): "-0.3", (1, 3): "-0.92"}),
        "watson": (Watson, {(1, 2): "-0.6", (2, 3): "-0.6", (3, 4): "-0.45", (2, 4): "-0.3", (1, 3): "-0.6"}),
        "whipple": (Whipple, {(1, 2): "-0.6", (2, 3): "-0.5", (3, 4): "-0.8", (2, 4): "-0.3", (1, 3): "-0.2"}),
        "saal": (
            PfaffSaalschuetz,
            {(1, 2): "-0.6", (2, 3): "-2.93", (3, 4): "-0.07", (2, 4): "2", (1, 3): "1.83"},
        ),
        "gauss": (Gauss, {(1, 2): "-0.75", (2, 3): "-0.45", (3, 4): "-0.2", (2, 4): "-0.8", (1, 3): "-0.5"}),
    }
    for key, (locus, exponents) in loci.items():
        add(form(f"A3.{key}.1", locus.match(finite(5, exponents)).form))
    products = {
        6: {(1, 2): "-0.7", (1, 3): "-0.35", (1, 4): "-0.2", (2, 3): "-0.55", (3, 4): "-0.7", (4, 5): "-0.4"},
        7: {
            **{(1, 2): "-0.7", (1, 3): "-1.15", (1, 4): "0.23", (1, 5): "-0.48"},
            **{(2, 3): "-0.55", (3, 4): "-0.33", (4, 5): "-0.4", (5, 6): "-0.72"},
        },
        8: {
            **{(1, 2): "-0.7", (1, 3): "-0.35", (1, 4): "-0.37", (1, 5): "-0.48", (1, 6): "-0.55"},
            **{(2, 3): "-0.55", (3, 4): "-0.53", (4, 5): "-0.4", (5, 6): "-0.72", (6, 7): "-0.55"},
        },
    }
    for n, exponents in products.items():
        add(form(f"A4.betaprod.n{n}.1", BetaProduct.read_off(finite(n, exponents))))
    six = {(1, 2): "-0.7", (2, 3): "-0.55", (4, 5): "-0.4"}
    chain = finite(6, {**six, (1, 3): "-0.35", (1, 4): "-0.2", (2, 5): "-0.3", (3, 4): "-0.7"})
    add(form("A5.4F3.1", HypergeometricChain.read_off(chain)))
    chain = finite(6, {**six, (1, 3): "-1.15", (1, 4): "-0.37", (2, 4): "0.6", (3, 4): "-0.33"})
    add(form("A5.beta3F2.1", HypergeometricChain.read_off(chain)))
    kampe = finite(6, {**six, (1, 3): "-0.05", (1, 4): "-0.55", (2, 4): "-0.35", (3, 4): "-0.3", (3, 5): "-0.45"})
    add(
        disk(
            "A5.kampe.1",
            [(1, kampe)],
            "one-dimensional quadrature of two 2F1 (DLMF 15.6.1), a Kampe de Feriet function",
            value=two_gauss_series(kampe),
        )
    )
    dougall = finite(
        7,
        {
            **{(1, 2): "-0.69", (1, 3): "-1.2", (1, 4): "-0.9", (1, 5): "1", (2, 3): "0.14", (2, 6): "-0.7"},
            **{(3, 4): "0.05", (4, 5): "-1.05", (5, 6): "-0.96"},
        },
    )
    add(form("A6.dougall5F4.n7.1", RogersDougall.read_off(dougall)))
    add(form("A7.dixonanderson.n6.1", DixonAnderson(("0.3", "0.4", "0.5"), "0.2", "0.35")))
    add(form("A7.dixonanderson.n8.1", DixonAnderson(("0.3", "0.4", "0.4", "0.5"), "0.2", "0.35", "0.15")))
    for count in (2, 3, 4, 5):
        add(form(f"A8.selberg.n{count + 3}.1", Selberg(count, "0.4", "0.3", "0.2")))
    aomoto = AomotoInsertion(3, "0.4", "0.3", "0.2", 1)
    add(
        disk("A9.aomoto.n6.1", [(1, p) for p in aomoto.terms()], aomoto.source, value=aomoto.value(WORK), digits=DIGITS)
    )
    aomoto = AomotoInsertion(4, "-0.6", "1.3", "-0.07", 2)
    add(disk("A9.aomoto.n7.2", [(1, p) for p in aomoto.terms()], aomoto.source, value=aomoto.value(WORK)))

    for name, closed in (
        ("B1.cbeta.1", ComplexBeta("0.3", "0.3", "0.35", "0.35")),
        ("B1.cbeta.spin", ComplexBeta("0.3", "1.3", "0.45", "-0.55")),
        ("F12", ComplexBeta("-4.3", "-1.3", "-2.6", "-3.6")),
        ("B2.cselberg.n4", ComplexSelberg(1, "0.4", "0.35", "0.1")),
        ("B2.cselberg.n5", ComplexSelberg(2, "0.3", "0.25", "0.05")),
        ("B2.cselberg.n6", ComplexSelberg(3, "0.28", "0.23", "0.03")),
        ("B2.cselberg.n7", ComplexSelberg(4, "0.25", "0.2", "0.02")),
        ("F12b", ComplexSelberg(2, "-1.3", "-2.43", "0.35")),
    ):
        add(sphere(name, 1, closed.left, closed.right, closed.source, value=closed.value(WORK)))

    def word(text: str) -> tuple[int, ...]:
        return tuple(map(int, text))

    for text in ("12345|12345", "12345|13245", "12345|13524", "12345|12453", "13245|12345"):
        left, right = map(word, text.split("|"))
        add(z_entry(f"C.Z5.1.{text}", FIVE, left, right))
    for text in ("12345|12345", "12345|13245", "13245|13245"):
        left, right = map(word, text.split("|"))
        add(j_entry(f"C.J5.1.{text}", FIVE, left, right))
    with mpmath.workdps(WORK):
        s12, s23, s34, s45, s51 = (mpmath.pi * big(exact(x)) for x in FIVE.values())
        cot, csc = mpmath.cot, mpmath.csc
        cyc = (s12, s23, s34, s45, s51)
        compatible = ((0, 2), (1, 3), (2, 4), (3, 0), (4, 1))
        diagonal = 1 + sum(cot(cyc[i]) * cot(cyc[j]) for i, j in compatible)
        for text, value in (
            ("12345|12345", diagonal),
            ("12345|12354", -csc(s45) * (cot(s12) + cot(s23))),
            ("12345|13254", csc(s23) * csc(s45)),
            ("12345|12453", -csc(s12) * csc(s45)),
        ):
            left, right = map(word, text.split("|"))
            add(kernel_entry(f"C.m5.1.{text}", FIVE, left, right, value))
    for text in ("1234|1234", "1234|1243", "1324|1234"):
        left, right = map(word, text.split("|"))
        add(z_entry(f"C.Z4.1.{text}", FOUR, left, right))
    add(j_entry("C.J4.1.1234|1234", FOUR, word("1234"), word("1234")))
    add(j_entry("C.J4.1.1234|1243", FOUR, word("1234"), word("1243")))
    with mpmath.workdps(WORK):
        s, t = (mpmath.pi * big(exact(x)) for x in FOUR.values())
        add(kernel_entry("C.m4.1", FOUR, word("1234"), word("1234"), mpmath.cot(s) + mpmath.cot(t)))
    with mpmath.workdps(34):
        sign, pairs = z_term(pairs_of(SIX), word("123456"), word("123456"))
        value = sign * sector_sum(pairs, 18, BIG)
    add(
        z_entry(
            "C.Z6.123456|123456",
            SIX,
            word("123456"),
            word("123456"),
            value=value,
            digits=20,
            source="Gauss-Jacobi quadrature over sectors in multiple precision",
        )
    )

    for scale in ("1", "1/10"):
        planar = {key: str(Fraction(x) * Fraction(scale)) for key, x in MIXED.items()}
        s = pairs_of(planar)
        for row in ((2, 3), (3, 2)):
            for column in ((2, 3), (3, 2)):
                first, second = column
                ends = [(1, first), (second, 4)]
                coefficient = prod((s[tuple(sorted(p))] for p in ends[1:]), start=s[tuple(sorted(ends[0]))])
                shift = {**s}
                for p in ends:
                    shift[tuple(sorted(p))] = shift[tuple(sorted(p))] - 1
                order = (1, *row, 4, 5)
                inner = {
                    (i + 1, j + 1): shift[tuple(sorted((order[i], order[j])))]
                    for i, j in combinations(range(4), 2)
                    if (i, j) != (0, 3)
                }
                name = f"D5.F[{row[0]}{row[1]},{column[0]}{column[1]}].scale{scale}"
                source = (
                    "Mafra, Schlotterer, Stieberger 2011, arXiv:1106.2645, arXiv:1106.2646; value by "
                    + FivePoint.source
                )
                note = "row: domain 1,row,4,5; column: s_1a s_b4 / (|z_1a| |z_b4|)"
                add(disk(name, [(coefficient, finite(5, inner))], source, planar=planar, note=note))
    for s_text, t_text in (("1/10", "-1/5"), ("1/100", "3/100")):
        s, t = exact(s_text), exact(t_text)
        coefficient = s * t / (s + t)
        beta, complex_beta = EulerBeta(s, t), ComplexBeta(s, s, t, t)
        note = "Gamma(1+s) Gamma(1+t) / Gamma(1+s+t)"
        add(disk(f"D4.F.{s_text},{t_text}", [(coefficient, beta.pairs())], beta.source, note=note))
        note = "single-valued image of D4.F (Stieberger, arXiv:1310.3259)"
        name = f"D4.svF.{s_text},{t_text}"
        add(sphere(name, coefficient, complex_beta.left, complex_beta.right, complex_beta.source, note=note))
    a, b = exact("0.3"), exact("0.45")
    c = 1 - a - b
    add(
        disk(
            "E1.open3.a=0.3,b=0.45",
            [(1, EulerBeta(x, y).pairs()) for x, y in ((a, b), (b, c), (c, a))],
            "Koba and Nielsen 1969: the three orderings of four tachyons",
        )
    )
    closed = ComplexBeta(a, a, b, b)
    add(sphere("E2.closed.a=0.3,b=0.45", 1, closed.left, closed.right, closed.source))

    def beta4(name: str, s: str, t: str, note: str) -> None:
        add(form(name, EulerBeta(s, t), note=note))

    def five(name: str, values: Sequence[str], note: str) -> None:
        planar = dict(zip(FIVE, values, strict=True))
        add(z_entry(name, planar, (1, 2, 3, 4, 5), (1, 2, 3, 4, 5), note=note))

    beta4("F01", "1e-10", "0.37", "near a massless pole")
    five("F02", ("1e-6", "0.31", "-1e-6", "0.42", "0.27"), "two compatible channels near their poles")
    five("F03", ("1e-7", "2e-7", "0.5", "0.35", "0.45"), "two incompatible channels near their poles")
    five("F04", ("-2.3", "-1.4", "-2.6", "-1.35", "-2.45"), "all five channels past one to three poles")
    five("F04b", ("-2.5", "-2.5", "-2.5", "-2.5", "-2.5"), "all five channels at -5/2")
    five("F05", ("-5.3", "-4.4", "-6.6", "-4.35", "-5.45"), "all five channels past five to seven poles")
    five("F05b", ("-2.000001", "0.31", "-1.000001", "0.42", "-0.27"), "two compatible massive poles at 1e-6")
    beta4("F06", "-20.3", "-17.6", "past 20 poles")
    five("F06b", ("40.3", "39.1", "-38.7", "41.2", "37.6"), "exponents near +-40")
    beta4("F07", "1/2+50j", "1/2-30j", "oscillatory and tiny")
    five("F07b", ("0.4+10j", "0.7+30j", "0.3-20j", "0.6+50j", "0.5-15j"), "imaginary parts of 10 to 50")
    five("F07d", ("-1.4+4j", "0.3-2j", "-0.5+3j", "-2.35-1j", "0.45+2j"), "complex and continued")
    beta4("F08", "-987/1000", "979/1000", "double pole z^(s-2) (1-z)^t at s = 0.013, t = -0.021")
    beta4("F09", "-1.3", "-0.699999999", "near a zero")
    for name, closed, note in (
        ("F10b", Selberg(6, "0.4", "0.3", "0.2"), "n = 9"),
        ("F10c", Selberg(4, "0.4", "0.5", "-0.09"), "nested clusters with negative exponents"),
        ("F10d", Selberg(3, "-1.6", "-2.66", "0.35"), "several channels past poles"),
        ("F10e", Selberg(3, "12.3", "-8.4", "2.6"), "large exponents of both signs"),
    ):
        add(form(name, closed, note=note))
    return entries


def main() -> None:
    entries = published_entries()
    text = json.dumps({"format": 1, "entries": entries}, indent=1, ensure_ascii=True)
    (HERE / "published_values.json").write_text(text + "\n", encoding="utf-8")
    print(f"{len(entries)} entries")


if __name__ == "__main__":
    main()
