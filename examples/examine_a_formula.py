"""Is this closed form right, and if not, what is wrong with it?

python examples/examine_a_formula.py
"""

import kn_integrate as kn

five = kn.DiskIntegral(5, kn.parke_taylor(1, 2, 3, 4, 5))

# On the locus s24 = 0 the five-point integral is a product of two beta functions.
claim = "beta(s12, s23) * beta(s45, s34)"
print(kn.examine_formula(claim, five, where={"s24": "0"}))

# The same claim with a slip: one argument is too large by one.
slip = kn.examine_formula("beta(s12, s23) * beta(s45 + 1, s34)", five, where={"s24": "0"})
print(slip)
print(slip.counterexample)
