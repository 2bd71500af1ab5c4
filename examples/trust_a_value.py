"""A number without a closed form, and every independent reason to believe it.

An invented referee doubts one entry of a table: the six-point integral Z_123456(PT(1,3,2,5,4,6)) at a point two
channels past their first poles.  Nobody has a formula for it.  This script computes it by engines that share no code,
by rules that continue in different ways, and by relations that express it through other integrals.

    python examples/trust_a_value.py
"""

from __future__ import annotations

import kn_integrate as kn

POINT = kn.Mandelstams.from_planar(
    6,
    {
        (1, 2): "-13/10",
        (2, 3): "2/5",
        (3, 4): "1/2",
        (4, 5): "-7/5",
        (5, 6): "9/20",
        (1, 6): "3/7",
        (1, 2, 3): "1/3",
        (2, 3, 4): "5/8",
        (3, 4, 5): "2/7",
    },
)


def main() -> None:
    check = kn.cross_check(POINT, kn.parke_taylor(1, 3, 2, 5, 4, 6), rtol=1e-9, budget=30)
    print(f"verdict: {check.verdict}")
    for row in check.rows:
        outcome = row.note if row.value is None else f"{row.value.real:.6f}"
        print(f"  {row.route:32s} {outcome}")
    print("Agreement of independent routes is evidence, not proof.")
    assert check.verdict == "consistent"


if __name__ == "__main__":
    main()
