from __future__ import annotations

import json
import pickle
from fractions import Fraction
from itertools import permutations

import numpy as np
import pytest
from click.testing import CliRunner

import kn_integrate as kn
from kn_integrate.amplitudes.basis import Chiral, integer_shift
from kn_integrate.amplitudes.reduction import ResonanceError, parke_taylor_form, partial_fractions
from kn_integrate.amplitudes.states import kinematics_of
from kn_integrate.cli import main
from kn_integrate.exact import Exact
from kn_integrate.momenta import random_momenta

ALPHA = Fraction(1, 20)
NULL = ((3, 3, 0, 0), (3, -3, 0, 0), (-3, 0, -3, 0), (-3, 0, 3, 0))  # four light-like momenta
ACROSS = ((0, 0, 1, 0), (0, 0, 0, 1), (0, 1, 0, 2), (0, 1, 0, 0))
RING = ((0, 1, 0), (0, "3/5", "4/5"), (0, -1, 0), (0, "-3/5", "-4/5"))  # four tachyons at alpha' = 1


def transverse(k, rng):
    e = [Exact(Fraction(int(rng.integers(-9, 10)), int(rng.integers(1, 7)))) for _ in k]
    rest = sum((a * b for a, b in zip(e[1:], k[1:], strict=True)), Exact(0))
    e[0] = rest / k[0]
    return tuple(e)


def bosons(n, seed, dimension=6):
    rng = np.random.default_rng(seed)
    return [kn.gauge_boson(k, transverse(k, rng)) for k in random_momenta(n, dimension, rng)]


# --- states ---------------------------------------------------------------------------------------------------------


def test_states_keep_exact_numbers():
    state = kn.gauge_boson((1, "3/5", 0.0, "4/5"), (0, 0, "1/3+1j", 0))
    assert state.momentum == (1, Fraction(3, 5), 0, Fraction(4, 5))
    assert state.left == (0, 0, Exact(Fraction(1, 3), Fraction(1)), 0)
    assert state.right is None
    assert state.rounded
    assert not kn.gauge_boson(NULL[0], ACROSS[0]).rounded
    assert pickle.loads(pickle.dumps(state)) == state
    assert len({state, kn.gauge_boson((1, "3/5", 0.0, "4/5"), (0, 0, "1/3+1j", 0))}) == 1


@pytest.mark.parametrize(
    ("make", "field"),
    [
        (lambda: kn.gauge_boson((1, 0, 0), (0, 1, 0)), "k"),
        (lambda: kn.gauge_boson((1, 1, 0), (1, 0, 0)), "e"),
        (lambda: kn.gauge_boson((1, 1, 0), (0, 0, 0, 1)), "e"),
        (lambda: kn.massless_tensor((1, 1, 0), (1, 0, 0), (0, 0, 1)), "left"),
        (lambda: kn.massless_tensor((1, 1, 0), (0, 0, 1), (1, 0, 0)), "right"),
        (lambda: kn.tachyon(3), "k"),
        (lambda: kn.tachyon("1,0"), "k"),
        (lambda: kn.tachyon((1,)), "k"),
        (lambda: kn.tachyon((1, True)), "k, component 1"),
        (lambda: kn.tachyon((1, float("nan"))), "k, component 1"),
        (lambda: kn.tachyon((1, "a/b")), "k, component 1"),
        (lambda: kn.gauge_boson((1.0, 1.0, 1e-4), (0, 0, 1)), "k"),
    ],
)
def test_bad_states_are_named(make, field):
    with pytest.raises(kn.InputError) as caught:
        make()
    assert caught.value.field == field


@pytest.mark.parametrize(
    ("call", "field"),
    [
        (lambda: kn.open_amplitude([kn.tachyon(k) for k in RING[:2]]), "states"),
        (lambda: kn.open_amplitude([kn.closed_tachyon(k) for k in RING]), "states, entry 1"),
        (lambda: kn.closed_amplitude([kn.tachyon(k) for k in RING]), "states, entry 1"),
        (lambda: kn.open_amplitude([*RING]), "states, entry 1"),
        (lambda: kn.open_amplitude(3), "states"),
        (lambda: kn.open_amplitude([kn.tachyon(k) for k in (*RING[:3], (0, 1, 0))]), "momenta"),
        (lambda: kn.open_amplitude([kn.tachyon((*k, 0)) for k in RING[:3]] + [kn.tachyon(RING[3])]), "states"),
        (lambda: kn.open_amplitude([kn.tachyon(k) for k in RING], alpha_prime=2), "states, entry 1"),
        (lambda: kn.open_amplitude([kn.tachyon(k) for k in RING], alpha_prime=0), "alpha_prime"),
        (lambda: kn.open_amplitude([kn.tachyon(k) for k in RING], alpha_prime=True), "alpha_prime"),
        (lambda: kn.open_amplitude([kn.tachyon(k) for k in RING], (1, 2, 3)), "ordering"),
        (lambda: kn.open_amplitude([kn.tachyon(k) for k in RING], (1, 2, 3, 3)), "ordering"),
        (lambda: kn.open_amplitude([kn.tachyon(k) for k in RING], method="magic"), "method"),
        (lambda: kn.open_amplitude([kn.tachyon(k) for k in RING], rtol=0), "rtol"),
        (lambda: kn.open_amplitude([kn.tachyon(k) for k in RING], coupling="x"), "coupling"),
        (lambda: kn.open_superstring_amplitude([kn.tachyon(k) for k in RING]), "states, entry 1"),
        (lambda: kn.yang_mills_amplitude([kn.tachyon(k) for k in RING]), "states, entry 1"),
        (lambda: kn.exchange_residue(-1), "level"),
        (lambda: kn.exchange_residue(True), "level"),
        (lambda: kn.exchange_residue(1, "heterotic"), "string"),
        (lambda: kn.partial_waves((1, 2), 3), "dimension"),
    ],
)
def test_bad_calls_are_named(call, field):
    with pytest.raises(kn.InputError) as caught:
        call()
    assert caught.value.field == field


# --- integrands -----------------------------------------------------------------------------------------------------


def test_contraction_of_two_vectors_and_two_tachyons():
    """By hand: e3.e4/(2 alpha' z34^2) plus the product of two single contractions with the last leg eliminated."""
    k = ((0, 1, 0), (0, -1, 0), (1, 1, 0), (-1, -1, 0))
    e3, e4 = (1, 1, 5), (2, 2, 7)
    states = [kn.tachyon(k[0]), kn.tachyon(k[1]), kn.gauge_boson(k[2], e3), kn.gauge_boson(k[3], e4)]
    pair = "35/2" * kn.monomial({(3, 4): -2})
    three = kn.monomial({(1, 4): 1, (3, 1): -1, (3, 4): -1}) - kn.monomial({(2, 4): 1, (3, 2): -1, (3, 4): -1})
    four = kn.monomial({(1, 3): 1, (4, 1): -1, (4, 3): -1}) - kn.monomial({(2, 3): 1, (4, 2): -1, (4, 3): -1})
    assert kn.vertex_integrand(states) == pair + three * (2 * four)


@pytest.mark.parametrize(("n", "terms"), [(4, 43), (5, 558), (6, 8671)])
def test_number_of_monomials(n, terms):
    """sum over pairings of (n - 2)^(unpaired legs) products; some coincide."""
    states = bosons(n, n, 9)
    f = kn.vertex_integrand(states, ALPHA)
    assert 0 < len(f.terms) <= terms
    for term in f.terms:
        degrees = [sum(p for pair, p in term.powers if i in pair) for i in range(1, n + 1)]
        assert degrees == [-2] * n


def test_integrands_serve_disk_integrals():
    states = bosons(4, 3)
    kin = kinematics_of(states, Exact(ALPHA))
    direct = kn.disk_integral(kin, kn.vertex_integrand(states, ALPHA), ordering=(2, 1, 3, 4))
    found = kn.open_amplitude(states, (2, 1, 3, 4), ALPHA)
    # g^(n-2)/alpha' (2 alpha')^(4/2)
    assert abs(found.value - direct.value / 5) <= found.error + direct.error


# --- the reduction --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "own", [((1, -2), (3, 1), (4, -1)), ((1, 2), (3, -3)), ((3, 2), (4, 1)), (), ((1, 3), (4, -1))]
)
def test_partial_fractions_are_identities(own):
    z = {0: Fraction(7, 3), 1: Fraction(0), 3: Fraction(2), 4: Fraction(-5)}
    expected = Fraction(1)
    for p, k in own:
        expected *= (z[0] - z[p]) ** k
    total = Fraction(0)
    for (p, k), powers, c in partial_fractions(own):
        part = c * (z[0] - z[p]) ** k
        for (i, j), power in powers:
            part *= (z[i] - z[j]) ** power
        total += part
    assert total == expected


@pytest.mark.parametrize(
    "text",
    ["z12^-2*z34^-2", "z12^-3*z34^-3*z14*z23", "z13^-2*z24^-2", "z12^-2*z13*z14^-1*z23^-1*z24*z34^-2"],
)
def test_reduced_integrands_keep_their_value(text):
    kin = kn.Mandelstams.from_planar(4, {(1, 2): "37/10", (2, 3): "31/7"})
    f = kn.parse_integrand(text)
    chiral = Chiral(kin, f)
    for order in ((1, 2, 3, 4), (1, 3, 2, 4), (3, 1, 2, 4)):
        found, direct = chiral.value(order, 20), kn.disk_integral(kin, f, ordering=order, digits=20)
        assert abs(found.value - direct.value) <= found.error + direct.error


def test_complex_invariants_and_coefficients():
    kin = kn.Mandelstams.from_planar(
        5, {(1, 2): "3/10+1/2j", (2, 3): "2/5", (3, 4): "1/2-1/7j", (4, 5): "7/20", (5, 1): "9/20+1j"}
    )
    f = kn.parse_integrand("z12^-2*z34^-1*z45^-1*z35^-1") * (kn.monomial({}) * Exact(2, 3))
    f = f + kn.parke_taylor(1, 2) * kn.parke_taylor(3, 4, 5)
    found, direct = Chiral(kin, f).value((1, 2, 3, 4, 5), 20), kn.disk_integral(kin, f, digits=20)
    assert abs(found.value - direct.value) <= found.error + direct.error


def test_parke_taylor_factors_reduce_to_themselves():
    kin = kn.Mandelstams.random(5, 3)
    for word in permutations((2, 3, 4)):
        chiral = Chiral(kin, kn.parke_taylor(1, *word, 5))
        direct = kn.disk_integral(kin, kn.parke_taylor(1, *word, 5), digits=15)
        found = chiral.value((1, 2, 3, 4, 5), 15)
        assert abs(found.value - direct.value) <= found.error + direct.error


def test_resonances_are_refused_not_wrong():
    """s12 = 1: the total derivative that lowers z12^-2 vanishes."""
    kin = kn.Mandelstams.from_planar(4, {(1, 2): 1, (2, 3): "1/3"})
    with pytest.raises(ResonanceError):
        parke_taylor_form(4, kn.parse_integrand("z12^-2*z34^-2"), kin.pair)


def test_a_vanishing_coefficient_on_a_pole_is_not_a_zero():
    """s23 = 0 in the shifted point: zero times infinity; the value is B(1, 1) = 1."""
    k = ((0, 1, 0), (0, 0, 1), (0, -1, 0), (0, 0, -1))
    found = kn.open_amplitude([kn.tachyon(q) for q in k], (1, 2, 3, 4))
    assert found.ok
    assert found.value == pytest.approx(1, abs=1e-12)
    with pytest.raises(kn.PoleError):
        kn.open_amplitude([kn.tachyon(q) for q in k], (1, 3, 2, 4))


@pytest.mark.parametrize(
    "rows", [(-2, -2, 0, 0), (0, -2, 0, -2, 0), (-2, -2, -2, 0), (-2, 0, 0), (-2,) * 5, (0, 0, 0, -2)]
)
def test_integer_shifts_have_the_rows(rows):
    sigma = integer_shift(tuple(Exact(r) for r in rows))
    for i, row in enumerate(rows, start=1):
        assert sum(k for pair, k in sigma.items() if i in pair) == -row


def test_odd_rows_have_no_shift():
    with pytest.raises(kn.InputError):
        integer_shift((Exact(-1), Exact(0), Exact(0), Exact(0)))


# --- amplitudes -----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("n", [4, 5])
def test_cyclic_and_reflected_orderings(n):
    states = bosons(n, 7 + n)
    order = tuple(range(1, n + 1))
    found = kn.open_amplitude(states, order, ALPHA)
    turned = kn.open_amplitude(states, order[2:] + order[:2], ALPHA)
    mirror = kn.open_amplitude(states, order[::-1], ALPHA)
    assert abs(found.value - turned.value) <= found.error + turned.error
    assert abs(found.value - (-1) ** n * mirror.value) <= found.error + mirror.error
    relabelled = kn.open_amplitude([states[2], *states[:2], *states[3:]], (2, 3, 1, *order[3:]), ALPHA)
    assert abs(found.value - relabelled.value) <= found.error + relabelled.error


def test_floats_agree_with_exact_input():
    states = bosons(5, 17)
    found = kn.open_amplitude(states, (1, 2, 3, 4, 5), ALPHA)
    rough = [kn.gauge_boson([float(x) for x in s.momentum], np.array([float(x) for x in s.left])) for s in states]
    close = kn.open_amplitude(rough, (1, 2, 3, 4, 5), float(ALPHA))
    assert close.ok
    assert close.value == pytest.approx(found.value, rel=1e-10)


def test_coupling_and_digits():
    states = bosons(4, 5)
    one = kn.open_amplitude(states, (1, 2, 3, 4), ALPHA)
    three = kn.open_amplitude(states, (1, 2, 3, 4), ALPHA, coupling=3)
    assert three.value == pytest.approx(9 * one.value, rel=1e-13)
    precise = kn.open_amplitude(states, (1, 2, 3, 4), ALPHA, digits=30)
    assert precise.ok
    assert precise.error <= 1e-30 * abs(precise.value)
    assert abs(precise.value - one.value) <= one.error
    closed = kn.closed_amplitude([kn.closed_tachyon(k) for k in random_momenta(4, 5, 1, squared_masses=-4)])
    assert "Kawai" in " ".join(closed.sources())


def test_six_gauge_bosons_in_one_run():
    """The whole n = 6 integrand by one reduction; another choice of gauge gives the same number."""
    states = bosons(6, 3)
    found = kn.open_amplitude(states, (1, 2, 3, 4, 5, 6), ALPHA)
    assert found.ok
    changed = list(states)
    for i in (1, 4):
        k, e = states[i].momentum, states[i].left
        changed[i] = kn.gauge_boson(k, [a + Fraction(3, 7) * b for a, b in zip(e, k, strict=True)])
    other = kn.open_amplitude(changed, (1, 2, 3, 4, 5, 6), ALPHA)
    assert abs(found.value - other.value) <= found.error + other.error


def test_reduction_alone_says_where_it_has_no_value():
    states = [kn.tachyon(q) for q in ((0, 1, 0), (0, 0, 1), (0, -1, 0), (0, 0, -1))]
    with pytest.raises((kn.PoleError, kn.NotAvailableError)):
        kn.open_amplitude(states, (1, 2, 3, 4), method="reduction")


def test_closed_amplitude_on_a_pole():
    """(k1 + k3)^2 = 0: the massless level."""
    states = [kn.closed_tachyon(q) for q in ((0, 2, 0), (0, "6/5", "8/5"), (0, -2, 0), (0, "-6/5", "-8/5"))]
    with pytest.raises(kn.PoleError) as caught:
        kn.closed_amplitude(states)
    assert (caught.value.channel, caught.value.level) == ((1, 3), 1)


def test_results_can_be_pickled():
    found = kn.open_amplitude(bosons(4, 8), (1, 2, 3, 4), ALPHA)
    assert pickle.loads(pickle.dumps(found)).value == found.value


# --- the command ----------------------------------------------------------------------------------------------------

JOB = """
version = 1
verb = "amplitude"
[amplitude]
alpha_prime = "1/25"
ordering = [1, 2, 3, 4]
states = [
  { kind = "gauge_boson", k = [3, 3, 0, 0], e = [0, 0, 1, 0] },
  { kind = "gauge_boson", k = [3, -3, 0, 0], e = [0, 0, 0, 1] },
  { kind = "gauge_boson", k = [-3, 0, -3, 0], e = [0, 1, 0, 2] },
  { kind = "gauge_boson", k = [-3, 0, 3, 0], e = [0, 1, 0, 0] },
]
"""


def run(*args):
    return CliRunner().invoke(main, ["amplitude", *args])


def test_job_file(tmp_path):
    path = tmp_path / "job.toml"
    path.write_text(JOB)
    result = run(str(path), "--format", "json")
    assert result.exit_code == 0
    document = json.loads(result.stdout)
    states = [kn.gauge_boson(k, e) for k, e in zip(NULL, ACROSS, strict=True)]
    assert float(document["value"]) == kn.open_amplitude(states, (1, 2, 3, 4), Fraction(1, 25)).value
    result = run(str(path), "--theory", "superstring", "--format", "json")
    expected = kn.open_superstring_amplitude(states, (1, 2, 3, 4), Fraction(1, 25))
    assert float(json.loads(result.stdout)["value"]) == expected.value


def test_flags():
    text = "tachyon 0,1,0; tachyon 0,3/5,4/5; tachyon 0,-1,0; tachyon 0,-3/5,-4/5"
    result = run("--states", text, "--ordering", "1,2,3,4", "--format", "json")
    expected = kn.open_amplitude([kn.tachyon(k) for k in RING], (1, 2, 3, 4))
    assert float(json.loads(result.stdout)["value"]) == expected.value
    k = ("0,2,0,0", "0,0,2,0", "1/4,-1/2,-3/2,5/4", "-1/4,-3/2,-1/2,-5/4")
    result = run("--states", "; ".join(f"closed_tachyon {q}" for q in k), "--format", "json")
    document = json.loads(result.stdout)
    assert document["method"] == "klt+kz"
    # prod Gamma(x)/Gamma(1-x) at 1, 1/2, -1/2 would be infinite: 1/Gamma(0) makes it zero
    assert abs(float(document["value"])) <= float(document["error"])


@pytest.mark.parametrize(
    ("args", "words"),
    [
        ((), "--states"),
        (("--states", "graviton 1,2"), "tachyon"),
        (("--states", "tachyon 1,2 | 3,4"), "entry 1"),
        (("--states", "tachyon 1,x"), "entry 1"),
        (("--states", "tachyon 0,1,0; tachyon 0,0,1; tachyon 0,1,0"), "add up to zero"),
        (("--states", "gauge_boson 1,0,0 | 0,1,0"), "mass shell"),
        (
            ("--states", "closed_tachyon 0,2,0; closed_tachyon 0,0,2; closed_tachyon 0,-2,0", "--ordering", "1,2,3"),
            "ordering",
        ),
    ],
)
def test_bad_flags(args, words):
    result = run(*args)
    assert result.exit_code == 2
    assert words in result.stderr
    assert "Traceback" not in result.stderr


def test_help_states_the_conventions():
    text = " ".join(run("--help").stdout.split())
    assert "mostly plus" in text
    assert "2 alpha' k_i.k_j" in text
