"""Independent ways to one value: engines, rules, closed forms, and relations solved for it."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import partial
from typing import Any

from ..api import disk_integral
from ..closed_forms import PairExponents, find, find_sphere
from ..dispatch.family import disk_family
from ..dispatch.shifts import chords_of
from ..errors import InputError
from ..exponents import DiskExponents
from ..integrals import DiskIntegral
from ..integrand import Integrand, parse_integrand
from ..relations import cyclic, kernel_null_vector, monodromy, u_equation
from ..relations.linear import Relation, single_term
from ..sphere.evaluate import sphere_integral, sphere_terms

Answer = tuple[complex, float]  # value and bound on its error


@dataclass(frozen=True)
class Route:
    """One way to the value.

    Attributes
    ----------
    name : str
    family : str
        What the way rests on: routes of different families share nothing but definitions.
    independent_of : str
        The same for people.
    run : function
        Gives value and error bound.
    """

    name: str
    family: str
    independent_of: str
    run: Callable[[], Answer]


def _estimate(call: Callable[[], Any]) -> Answer:
    found = call()
    return complex(found.value), float(found.error)


def disk_routes(kin: Any, f: Any, ordering: Sequence[int] | None, rtol: float, threads: int) -> list[Route]:
    """The routes to a disk integral, cheap and strong ones first."""
    if isinstance(f, str):
        f = parse_integrand(f)
    family = disk_family(kin, f, ordering)
    n, terms = family.n, family.terms_at({})
    quadrature = partial(disk_integral, method="quadrature", rtol=rtol, threads=threads)
    series = partial(disk_integral, method="kz", rtol=rtol)
    if isinstance(f, DiskIntegral):
        f, ordering = f.f, f.ordering
    options = {} if isinstance(kin, DiskExponents) else {"ordering": ordering}
    arguments = (kin,) if isinstance(kin, DiskExponents) else (kin, f)
    rules = "the series engine, closed forms"
    routes = [
        Route("quadrature", "quadrature", rules, lambda: _estimate(partial(quadrature, *arguments, **options))),
        Route(
            "series (KZ)",
            "series",
            "quadrature, closed forms",
            lambda: _estimate(partial(series, *arguments, **options)),
        ),
    ]
    matches = [find(PairExponents.of(term.pairs)) for term in terms]
    if terms and all(matches):
        form = matches[0][0].form

        def closed() -> Answer:
            total: Any = 0
            for term, match in zip(terms, matches, strict=True):
                total = total + complex(term.coefficient.value()) * complex(match[0].form.value(20))
            size = sum(
                abs(complex(t.coefficient.value()) * complex(m[0].form.value(20)))
                for t, m in zip(terms, matches, strict=True)
            )
            return complex(total), 1e-15 * size

        routes.append(Route(f"closed form: {form.name}", "closed form", "both engines", closed))
    routes.append(
        Route(
            "quadrature, contour rule",
            "contour",
            "the other quadrature rules (same sectors)",
            lambda: _estimate(partial(quadrature, *arguments, rule="contour", **options)),
        )
    )
    relations: list[tuple[str, Callable[[], Relation]]] = []
    single = single_term(kin, f, ordering) if terms else None
    if single is not None and n >= 4:
        coefficient, exponents = single
        factor = complex(coefficient.value())
        chord = chords_of(n)[-1]

        def by_u() -> Answer:
            value, error = u_equation(exponents, chord).solved(series)
            return factor * value, abs(factor) * error

        routes.append(Route("u-equation by series", "series", "quadrature (other exponents)", by_u))
    if not isinstance(kin, DiskExponents) and isinstance(f, Integrand):
        integrand, order = f, ordering
        relations.append(("cyclic rotation by quadrature", lambda: cyclic(kin, integrand, order)))
        relations.append(("monodromy by series", lambda: monodromy(kin, integrand, order)))
        relations.append(("monodromy by quadrature", lambda: monodromy(kin, integrand, order)))
        if n <= 5:
            relations.append(("kernel null vector by series", lambda: kernel_null_vector(kin, integrand, order)))
    for name, make in relations:
        engine = series if name.endswith("series") else quadrature
        kind = "series" if engine is series else "quadrature"
        other = "quadrature (other orderings)" if engine is series else "the series engine (other orderings)"
        routes.append(Route(name, kind, other, partial(_solved, make, engine)))
    return routes


def _solved(make: Callable[[], Relation], engine: Callable[..., Any]) -> Answer:
    return make().solved(engine)


def sphere_routes(kin: Any, f: Any, g: Any, rtol: float, threads: int) -> list[Route]:
    """The routes to a sphere integral."""
    n, terms = sphere_terms(kin, f, g)
    if n > 8:
        raise InputError("kin", f"{n} legs", "at most 8 for sphere integrals")
    call = partial(sphere_integral, kin, f, g, rtol=rtol, threads=threads)
    routes = [
        Route(
            "bilinear of disk integrals", "klt", "the direct integral", lambda: _estimate(partial(call, method="klt"))
        )
    ]
    if len(terms) == 1:
        term = terms[0]
        left = [p + a for p, a in zip(term.pairs, term.left, strict=True)]
        right = [p + b for p, b in zip(term.pairs, term.right, strict=True)]
        for form in find_sphere(left, right)[:1]:
            factor = complex(term.coefficient.value())

            def closed(form: Any = form, factor: complex = factor) -> Answer:
                value = factor * complex(form.value(20))
                return value, 1e-15 * abs(value)

            routes.append(Route(f"closed form: {form.name}", "closed form", "all engines", closed))
    if f is not None and g is not None:
        swapped = partial(sphere_integral, kin, g, f, rtol=rtol, method="klt")
        routes.append(
            Route("left and right exchanged", "klt", "the pairing of the bilinear", lambda: _estimate(swapped))
        )
    if n <= 6:
        loose = max(rtol, {4: rtol, 5: 1e-8, 6: 1e-3}[n])
        direct = partial(sphere_integral, kin, f, g, rtol=loose, threads=threads, method="direct")
        routes.append(Route("direct over complex planes", "direct", "the bilinear", lambda: _estimate(direct)))
    return routes
