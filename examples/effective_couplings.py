"""Effective couplings of massless strings, and what an invented experiment would say about the string scale.

At energies far below the string scale a string amplitude is a field-theory amplitude plus contact interactions, one
for each power of alpha'.  For open strings (vector bosons) the first ones are F^4 with zeta(2) and D^2 F^4 with
zeta(3); for closed ones (gravitons) the first is R^4 with zeta(3).  This script reads them off, as polynomials in the
invariants, and then plays them against the limits of an invented collaboration.

    python examples/effective_couplings.py
"""

from __future__ import annotations

from itertools import permutations

import kn_integrate as kn
from kn_integrate.expansion import CoefficientFunction


def couplings() -> list[tuple[str, kn.ZetaSum, CoefficientFunction]]:
    """Name, zeta value and kinematic factor of the first contact terms."""
    z2, z3, z5 = kn.zeta(2), kn.zeta(3), kn.zeta(5)
    open_string = kn.FEntry(4)
    found = [
        ("F^4", z2, kn.reconstruct(open_string, zeta=z2)),
        ("D^2 F^4", z3, kn.reconstruct(open_string, zeta=z3)),
        ("D^4 F^4", z2 * z2, kn.reconstruct(open_string, zeta=z2 * z2)),
    ]
    f, g = kn.parke_taylor(1, 2, 3, 4), kn.parke_taylor(1, 2, 4, 3)
    # open: relative to the field-theory amplitude; closed: beside the field-theory limit -1/s12 of this integral
    found.append(("R^4, beside -1/s12", z3, kn.reconstruct(f, g, n=4, zeta=z3)))
    found.append(("D^4 R^4, beside -1/s12", z5, kn.reconstruct(f, g, n=4, zeta=z5)))
    return found


def show_couplings() -> None:
    print("Contact terms; s_ij = 2 alpha' k_i.k_j for open strings (F^4), alpha'/2 k_i.k_j for closed ones (R^4):\n")
    for name, value, factor in couplings():
        print(f"  {name:<24} {value!s:<10} x  {factor}")
        print(f"  {'':<24} LaTeX: {value.latex()} \\left({factor.latex()}\\right)")
    print("\nFive bosons, zeta(2): the 2 x 2 matrix that multiplies the field-theory amplitudes")
    words = list(permutations((2, 3)))
    for row in words:
        for column in words:
            print(f"  {row} {column}: {kn.reconstruct(kn.FEntry(5, row, column), zeta=kn.zeta(2))}")


# What the invented Kestrel collaboration published: at s = (300 GeV)^2 and t = -s/2, a relative deviation from the
# field-theory amplitude larger than this is excluded.
KESTREL = {"energy": 300.0, "deviation": 0.02}


def deviation(string_scale: float) -> float:
    """Relative deviation at Kestrel's point for alpha' = 1/string_scale^2, from the series through weight 8."""
    alpha = (KESTREL["energy"] / string_scale) ** 2
    kin = kn.Mandelstams.from_planar(4, {(1, 2): -1, (2, 3): "1/2"})  # X = -alpha' s, in units of the energy
    series = kn.alpha_expansion(kin, kn.FEntry(4), weight=8)
    return abs(series.partial_sum(alpha) - 1.0)


def show_limit() -> None:
    low, high = 350.0, 100_000.0
    while high - low > 0.5:
        middle = (low + high) / 2
        low, high = (middle, high) if deviation(middle) > KESTREL["deviation"] else (low, middle)
    print(f"\nKestrel (invented): deviations above {KESTREL['deviation']:.0%} excluded at {KESTREL['energy']:.0f} GeV")
    print(f"  string scale 1/sqrt(alpha') above {high:.0f} GeV")
    print("  how much each order contributes there:")
    alpha = (KESTREL["energy"] / high) ** 2
    kin = kn.Mandelstams.from_planar(4, {(1, 2): -1, (2, 3): "1/2"})
    for c in kn.alpha_expansion(kin, kn.FEntry(4), weight=6):
        if c.weight and c.exact:
            print(f"    alpha'^{c.order}: {c.value * alpha**c.order:+.5f}   {c.exact}")


if __name__ == "__main__":
    show_couplings()
    show_limit()
