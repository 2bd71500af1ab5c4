"""Disk integrals by a differential equation: one puncture at a time, no quadrature.

Let z be the puncture that is integrated last.  The integrals over all the others are functions of z that obey the
Knizhnik-Zamolodchikov equation ``f' = (A/z + B/(z-1)) f`` with constant triangular matrices; power series about z = 0
and about z = 1 give the integral over z.  Repeating this from three punctures up gives all (n-3)! basis integrals of
one ordering at once.

``pattern``         the index structure of A and B, independent of kinematics
``currents``        from basis integrals to Parke-Taylor integrands: amputated double currents of cubic trees
``series``          the recursion in double precision, with errors by stochastic rounding
``multiprecision``  the same in python-flint arithmetic, with errors by two precisions
``integral``        sums of integrals to a tolerance; escalation; resonances
``matrices``        public matrices of Z and F

Sources: Knizhnik and Zamolodchikov 1984; Aomoto 1987 and Terasoma 2002 on Selberg integrals; the recursion in the
number of points is the one of Broedel, Schlotterer, Stieberger and Terasoma (arXiv:1304.7304), here at finite
kinematics.  References from memory.
"""
