"""The file of published values: consistent with the conventions, reproduced by the closed forms, up to date."""

from __future__ import annotations

import json
import runpy
from itertools import combinations

import mpmath
import pytest
from load import PATH, published
from massless import big, in_order, j_value, massless_pairs, shifted, z_term

from kn_integrate.closed_forms import ComplexBeta, find, find_sphere

EVERYTHING = published()


def relative(value, reference) -> float:
    with mpmath.workdps(50):
        return float(abs(value - reference) / abs(reference))


def test_the_file_is_complete():
    assert len(EVERYTHING) == len({entry.id for entry in EVERYTHING}) == 81
    assert all(entry.source and entry.digits >= 20 for entry in EVERYTHING)
    assert {entry.kind for entry in EVERYTHING} == {"disk", "sphere", "inverse_kernel"}
    assert len(published("disk", 5)) > 20


@pytest.mark.parametrize("entry", [e for e in EVERYTHING if e.kind == "disk"], ids=lambda e: e.id)
def test_disk_values_by_every_closed_form_that_applies(entry):
    routes = [find(term.left) for term in entry.terms]
    if not all(routes):
        assert entry.id in {"A5.kampe.1", "C.Z6.123456|123456", "A9.aomoto.n6.1", "A9.aomoto.n7.2"}
        return
    with mpmath.workdps(50):
        for pick in range(max(map(len, routes))):
            total = sum(
                big(term.coefficient) * matches[min(pick, len(matches) - 1)].form.value(40)
                for term, matches in zip(entry.terms, routes, strict=True)
            )
            assert relative(total, entry.value) < 2 * 10.0 ** (1 - entry.digits)


@pytest.mark.parametrize("entry", [e for e in EVERYTHING if e.kind == "disk" and e.ordering], ids=lambda e: e.id)
def test_disk_exponents_follow_from_the_kinematics(entry):
    s = massless_pairs(entry.n, entry.planar)
    (cycle,) = entry.integrands
    sign, pairs = z_term(s, entry.ordering, cycle)
    (term,) = entry.terms
    assert term.coefficient == sign
    assert term.left == pairs
    # the sign at an explicit point of the ordering
    at = {label: k * k for k, label in enumerate(entry.ordering)}
    product = (-1) ** (entry.n - 1)
    for a, b in zip(cycle, [*cycle[1:], cycle[0]], strict=True):
        product *= at[a] - at[b]
    assert (product > 0) == (sign > 0)


@pytest.mark.parametrize("entry", [e for e in EVERYTHING if e.kind == "sphere"], ids=lambda e: e.id)
def test_sphere_values(entry):
    (term,) = entry.terms
    for i, j in combinations(range(1, entry.n + 1), 2):
        assert (term.left.at(i, j) - term.right.at(i, j)).is_integer
    with mpmath.workdps(50):
        if entry.planar:
            s = massless_pairs(entry.n, entry.planar)
            labels = tuple(range(1, entry.n + 1))
            sides = [in_order(shifted(s, cycle), labels) for cycle in entry.integrands]
            assert sides == [term.left, term.right]
            assert relative(j_value(s, *entry.integrands, 40), entry.value) < 1e-28
        matches = find_sphere(term.left, term.right)
        assert matches or (entry.n == 5 and entry.planar)
        for form in matches:
            value = big(term.coefficient) * form.value(40)
            if isinstance(form, ComplexBeta):
                # (z_3 - z_2) against (z_2 - z_3): all finite factors change sign together, an even number of times
                finite = [(1, 2), (1, 3), (2, 3)]
                flips = sum((term.left.at(*p) - term.right.at(*p)).re for p in finite)
                assert flips % 2 == 0
            assert relative(value, entry.value) < 1e-28


def test_inverse_kernel_inverts_the_momentum_kernel():
    # n = 5, P = 12345 with 4 and 5 exchanged in Q: m = -1 / (sines) in the basis 1,r,5,4 against 1,t,4,5
    from massless import momentum_kernel

    (entry,) = [e for e in EVERYTHING if e.id == "C.m5.1.12345|12354"]
    s = massless_pairs(5, entry.planar)
    with mpmath.workdps(40):
        words = [(2, 3), (3, 2)]
        kernel = mpmath.matrix([[momentum_kernel(s, r, t) for t in words] for r in words])
        inverse = (-kernel) ** -1
        # 12354 = (1,2,3,5,4) is the row 23, 12345 the column 23
        assert relative(inverse[0, 0], entry.value) < 1e-28


@pytest.mark.slow
def test_the_file_is_what_its_generator_writes():
    generator = runpy.run_path(str(PATH.parent / "make_published_values.py"))
    fresh = json.loads(json.dumps(generator["published_entries"]()))
    assert fresh == json.loads(PATH.read_text(encoding="utf-8"))["entries"]
