"""Two limits of high energy, computed beside what is predicted for them.

Regge limit (s large, t fixed): the four-tachyon function B(a, b), a = -1 - alpha' s, b = -1 - alpha' t, behaves as
``Gamma(b) a^-b (1 + b(1-b)/(2a) + ...)``: an exchange whose spin grows with t.  Fixed angle (s and t large, ratio
fixed): ``exp(-E (x log(1/x) + (1-x) log(1/(1-x))))``, E = a + b, a = E x, with the square root of Stirling's formula
in front, softer than any power (Veneziano 1968; Gross and Mende 1987, Gross and Manes 1989).  The same exponent, halved
in alpha' and doubled in number, rules closed strings; and gauge bosons, whose polarisations change powers of E only.
Kinematics with a, b > 0 are unphysical but free of poles; the limits are the same along other directions off the
real axis.

    python examples/regge_and_fixed_angle.py
"""

from __future__ import annotations

import math
from fractions import Fraction

import kn_integrate as kn

TACHYONS = kn.monomial({})  # no contraction is left: the integrand is 1


def four_tachyons(a: Fraction, b: Fraction) -> kn.Estimate:
    """``B(a, b)`` as a disk integral; the rows of tachyons are -2."""
    return kn.disk_integral(kn.Mandelstams.from_planar(4, {(1, 2): a - 1, (2, 3): b - 1}, row_sums=-2), TACHYONS)


def regge() -> None:
    b = Fraction(17, 10)
    print(f"Regge limit, b = {b}\n")
    print(f"  {'a':>8}  {'computed':>26}  {'leading':>12}  {'a (computed/leading - 1)':>24}")
    for a in (Fraction(10), Fraction(40), Fraction(160), Fraction(640), Fraction(2560)):
        found = four_tachyons(a, b)
        leading = math.gamma(b) * float(a) ** -float(b)
        print(f"  {int(a):>8}  {found!s:>26}  {leading:>12.6g}  {float(a) * (found.value / leading - 1):>24.8f}")
    print(f"  {'predicted':>8} {'':>42}  {float(b * (1 - b) / 2):>24.8f}\n")


def stirling(energy: Fraction, x: Fraction) -> float:
    """The leading behaviour at fixed angle."""
    a, b = float(energy * x), float(energy * (1 - x))
    log = (a - 0.5) * math.log(a) + (b - 0.5) * math.log(b) - (a + b - 0.5) * math.log(a + b)
    return math.sqrt(2 * math.pi) * math.exp(log)


def fixed_angle() -> None:
    x = Fraction(3, 10)
    print(f"Fixed angle, x = {x}\n")
    print(f"  {'E':>8}  {'computed':>26}  {'leading':>12}  {'E log(computed/leading)':>24}")
    for energy in (Fraction(10), Fraction(20), Fraction(40), Fraction(80), Fraction(160)):
        found = four_tachyons(energy * x, energy * (1 - x))
        leading = stirling(energy, x)
        print(
            f"  {int(energy):>8}  {found!s:>26}  {leading:>12.6g}  "
            f"{float(energy) * math.log(found.value / leading):>24.8f}"
        )
    print(f"  {'predicted':>8} {'':>42}  {float((1 / x + 1 / (1 - x) - 1) / 12):>24.8f}\n")


def gauge_bosons() -> None:
    """The exponent is universal: slopes of log|A| in alpha' for gauge bosons of the superstring, at fixed momenta.

    In front stands alpha'^(-1/2): 1/alpha' from the normalisation, the square root from Stirling's formula.
    """
    k = ((5, 3, 4, 0, 0), (-5, -3, 4, 0, 0), (5, -3, -4, 0, 0), (-5, 3, -4, 0, 0))
    e = ((0, 0, 0, 1, 2), (0, 0, 0, 1, 0), (0, 0, 0, 0, 1), (0, 0, 0, 1, 1))
    states = [kn.gauge_boson(*pair) for pair in zip(k, e, strict=True)]
    s, t = Fraction(64), Fraction(36)  # (k1 + k2)^2, (k2 + k3)^2: both positive, so that no pole is met
    exponent = float(s) * math.log(s) + float(t) * math.log(t) - float(s + t) * math.log(s + t)
    print("Gauge bosons of the superstring at fixed angle: slope of log|A alpha'^(1/2)| between alpha'/2 and alpha'\n")
    for alpha in (Fraction(1, 7), Fraction(2, 7), Fraction(4, 7), Fraction(8, 7)):
        one, two = (kn.open_superstring_amplitude(states, (1, 2, 3, 4), value) for value in (alpha, alpha / 2))
        slope = math.log(abs(one.value / two.value) * math.sqrt(2)) / float(alpha / 2)
        print(f"  alpha' = {alpha!s:>4}   A = {one!s:>26}   slope {slope:.5f}")
    print(f"  {'predicted':<56} {exponent:.5f}")


if __name__ == "__main__":
    regge()
    fixed_angle()
    gauge_bosons()
