"""Every relation against both engines, inside and outside the convergence region."""

from __future__ import annotations

from functools import partial

import pytest

import kn_integrate as kn
from kn_integrate import relations as r
from kn_integrate.dispatch.shifts import chords_of
from kn_integrate.relations.linear import single_term

ENGINES = {
    "quadrature": partial(kn.disk_integral, method="quadrature", rtol=1e-8),
    "kz": partial(kn.disk_integral, method="kz", rtol=1e-10),
}


def points(n):
    yield kn.Mandelstams.random(n, n, low=0, high=1)
    if n < 6:
        yield kn.Mandelstams.random(n, 7, low="-13/10", high=1, denominator=997)


def pt(n):
    return kn.parke_taylor(1, 3, 2, *range(4, n + 1))


@pytest.mark.parametrize("engine", ENGINES)
@pytest.mark.parametrize("n", [4, 5, 6])
@pytest.mark.parametrize(
    "make",
    [
        lambda kin, n: r.cyclic(kin, pt(n)),
        lambda kin, n: r.reflection(kin, pt(n)),
        lambda kin, n: r.monodromy(kin, pt(n)),
        lambda kin, n: r.u_one(kin, range(1, n + 1)),
        lambda kin, n: r.integration_by_parts(kin, range(1, n + 1)),
        lambda kin, n: r.kernel_null_vector(kin, pt(n)),
    ],
    ids=["cyclic", "reflection", "monodromy", "u-one", "by-parts", "null-vector"],
)
def test_linear_relations(make, n, engine):
    for kin in points(n):
        relation = make(kin, n)
        assert relation.source
        residual = relation.residual(ENGINES[engine])
        assert residual.holds, (relation.name, residual)
        assert residual.error < 1e-5 * residual.scale


@pytest.mark.parametrize("engine", ENGINES)
@pytest.mark.parametrize("n", [4, 5, 6])
def test_u_equations_of_every_chord(n, engine):
    for kin in points(n):
        _, exponents = single_term(kin, pt(n), None)
        for chord in chords_of(n):
            assert r.u_equation(exponents, chord).residual(ENGINES[engine]).holds


def test_a_relation_solved_for_its_integral():
    kin = kn.Mandelstams.random(5, 5, low=0, high=1)
    direct = kn.disk_integral(kin, pt(5))
    value, error = r.monodromy(kin, pt(5)).solved(ENGINES["kz"])
    assert abs(value - direct.value) <= error + direct.error


def test_a_wrong_engine_breaks_the_relations():
    kin = kn.Mandelstams.random(5, 5, low=0, high=1)

    def wrong(*arguments, **options):
        from dataclasses import replace

        found = kn.disk_integral(*arguments, **options)
        factor = 1.000001 if options.get("ordering", (1,))[0] == 2 else 1.0
        return replace(found, value=found.value * factor)

    assert r.monodromy(kin, pt(5)).residual(kn.disk_integral).holds
    assert not r.monodromy(kin, pt(5)).residual(wrong).holds


def test_signs_of_tachyons_and_odd_rows():
    kin = kn.Mandelstams.from_pairs(4, {(1, 2): "-3/5", (2, 3): "-7/10"}, row_sums=-2)
    one = kn.monomial({})
    for relation in (r.cyclic(kin, one), r.reflection(kin, one), r.monodromy(kin, one)):
        assert relation.residual(kn.disk_integral).holds


@pytest.mark.parametrize(("n", "channel"), [(5, (1, 2)), (5, (3, 4)), (6, (2, 3)), (6, (1, 2, 3)), (6, (1, 6))])
def test_factorisation(n, channel):
    kin = kn.Mandelstams.random(n, 9, low=0, high=1)
    found = r.factorisation(kin, channel, kn.disk_integral)
    assert found.holds
    assert found.error < 1e-7 * abs(found.left)


def test_field_theory_and_soft_limits():
    kin = kn.Mandelstams.random(5, 9, low="1/4", high=1)
    assert r.field_theory_limit(kin, (1, 2, 3, 4, 5), (1, 2, 4, 3, 5)).holds
    hard = kn.Mandelstams.from_planar(4, {(1, 2): "1/3", (2, 3): "2/5"})
    assert r.soft_limit(hard, ("1/3", "-1/4", "1/7"), kn.disk_integral).holds


@pytest.mark.parametrize("engine", ENGINES)
@pytest.mark.parametrize("n", [4, 5, 6])
def test_first_massive_level(n, engine):
    found = r.first_massive_level(kn.Mandelstams.random(n, 40 + n, low=0, high=1), ENGINES[engine])
    assert found.holds
    assert found.error < 1e-6 * abs(found.left)


@pytest.mark.parametrize("n", [4, 5, 6])
def test_inverse_kernel_and_bilinear(n):
    kin = kn.Mandelstams.random(n, 5, low=0, high=1)
    found = r.inverse_kernel(kin)
    assert found.holds
    assert found.error < 1e-9
    if n < 6:
        direct = partial(kn.sphere_integral, method="direct", rtol=1e-6)
        bilinear = partial(kn.sphere_integral, method="klt")
        sphere = r.klt(kin, pt(n), kn.parke_taylor(*range(1, n + 1)), direct, bilinear)
        assert sphere.holds


def test_bad_input():
    kin = kn.Mandelstams.random(5, 9)
    _, exponents = single_term(kin, pt(5), None)
    with pytest.raises(kn.InputError):
        r.u_equation(exponents, (1, 4))
    with pytest.raises(kn.InputError):
        r.kernel_null_vector(kin, pt(5), (2, 1, 3, 4, 5))
    with pytest.raises(kn.InputError):
        r.soft_limit(kin, (1, 2, 3), kn.disk_integral)
