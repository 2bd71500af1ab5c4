"""Run the kernels over all sectors with given rules, and read errors off the null functionals."""

from __future__ import annotations

import math
from collections.abc import Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .chords import ChordData
from .rules.base import Rule
from .sectors import SectorTable, mirror, sector_table

CHUNK = 2048  # outer points per chunk: fixed, so that the order of summation never depends on the thread count
EPSILON = 2.0**-52
SLOWEST = 0.999  # ratio of coefficients beyond which the sum of the rest is not looked at
NOISE = 64.0  # units of round-off below which a coefficient may be nothing else


@dataclass(frozen=True)
class Outcome:
    """What one pass over all sectors gives.

    Attributes
    ----------
    value : float | complex
    absolute : float
        Sum of the moduli of all terms: what round-off is relative to in the worst case.
    square : float
        Root of the sum of the squares of all terms: what independent errors of the terms add up to.
    weight_noise, weight_noise_sum : float
        What errors of the weights cost, in units of round-off, over all chords and nodes: added as independent ones
        (root of the sum of squares), and added up.
    truncation : (chords,) array
        Error of the rule of each chord, as extrapolated from its null functionals.
    decay : (chords,) array
        The ratio of successive coefficients that was used (the slowest group of the rule).
    least : float
        Least real part of any run; principal logarithms are right where it is positive.
    points : int
    """

    value: float | complex
    absolute: float
    square: float
    weight_noise: float
    weight_noise_sum: float
    truncation: NDArray[np.float64]
    decay: NDArray[np.float64]
    least: float
    points: int

    @property
    def finite(self) -> bool:
        """True when every number is finite and every logarithm on its right branch."""
        return bool(
            math.isfinite(abs(self.value))
            and math.isfinite(self.absolute)
            and np.isfinite(self.truncation).all()
            and self.least > 0
        )


@dataclass(frozen=True)
class Layout:
    """Which rule every variable of every sector uses.

    Attributes
    ----------
    rules : tuple of Rule
    chord : (rules,) array
        The chord each rule is for; one chord may have several rules.
    rows : (S, V) int32
        Index into ``rules`` for each variable of each sector, in the order of ``SectorTable.variables``.
    sectors : array
        The sectors that count.
    """

    rules: tuple[Rule, ...]
    chord: NDArray[np.int64]
    rows: NDArray[np.int32]
    sectors: NDArray[np.int64]

    @property
    def points(self) -> float:
        """Integrand evaluations, conjugate halves not yet taken off."""
        counts = np.array([rule.count for rule in self.rules], dtype=np.float64)
        return float(counts[self.rows[self.sectors]].prod(axis=1).sum())

    def shares(self, chords: int) -> NDArray[np.float64]:
        """For each chord the relative growth of all points when its rule gets one more node."""
        counts = np.array([rule.count for rule in self.rules], dtype=np.float64)
        rows = self.rows[self.sectors]
        sector_points = counts[rows].prod(axis=1)
        growth = np.zeros(chords)
        np.add.at(growth, self.chord[rows], sector_points[:, None] / counts[rows])
        shares: NDArray[np.float64] = growth / sector_points.sum()
        return shares


def simple_layout(n: int, rules: Sequence[Rule]) -> Layout:
    """One rule per chord."""
    table = sector_table(n)
    return Layout(tuple(rules), np.arange(len(rules)), table.variables, np.arange(table.count))


def _chunks(
    table: SectorTable, sectors: NDArray[np.int64], variables: NDArray[np.int32], counts: NDArray[np.int64]
) -> NDArray[np.int64]:
    outer = variables.shape[1] - min(2, variables.shape[1])
    totals = counts[variables[:, :outer]].prod(axis=1) if outer else np.ones(len(variables), dtype=np.int64)
    rows = [
        (s, lo, min(int(totals[s]), lo + CHUNK)) for s in sectors.tolist() for lo in range(0, int(totals[s]), CHUNK)
    ]
    return np.array(rows, dtype=np.int64).reshape(-1, 3)


def _spread(count: int, threads: int, work: Any) -> None:
    """Call ``work(first, last)`` over 0..count in fixed pieces; each piece writes to its own rows."""
    if threads <= 1 or count < 2 * threads:
        work(0, count)
        return
    pieces = min(count, 8 * threads)
    edges = [count * k // pieces for k in range(pieces + 1)]
    with ThreadPoolExecutor(threads) as pool:
        for future in [pool.submit(work, edges[k], edges[k + 1]) for k in range(pieces)]:
            future.result()


def _table_arguments(table: SectorTable, variables: NDArray[np.int32]) -> tuple[Any, ...]:
    return (
        variables,
        table.masks_prev,
        table.masks_var,
        table.mask_count,
        table.run_index,
        table.run_bounds,
        table.run_split,
        table.term_start,
        table.term_mask,
        table.term_class,
    )


def _pack(rules: Sequence[Rule], width: int, dtype: type) -> tuple[NDArray[Any], NDArray[Any]]:
    nodes: NDArray[Any] = np.ones((len(rules), width), dtype=dtype)
    weights: NDArray[Any] = np.zeros((len(rules), width), dtype=dtype)
    for row, rule in enumerate(rules):
        if dtype is float and not rule.is_real:
            continue  # no sector of the real kernel uses it
        nodes[row, : rule.count] = rule.nodes
        weights[row, : rule.count] = rule.weights
    return nodes, weights


def _extrapolate(
    rule: Rule, rows: NDArray[np.float64], sizes: NDArray[np.float64], order: float
) -> tuple[float, float]:
    """Error of a rule from the moduli of its null functionals, and the decay ratio used.

    Each of the last four coefficients is carried on to the first degree K that the rule gets wrong, and the largest
    result counts: coefficients of oscillating integrands are now and then small by accident.  Carried on at the
    measured ratio, or at the theoretical one of the nearest singularity, whichever is slower; measured ratios are taken
    two apart because singularities on both sides of the interval make coefficients alternate.  At a singularity
    ``(1 + c t)^-e`` coefficients go like ``k^(e-1) rho^-k``, so the theoretical decay from k to K has the factor
    ``(K/k)^order``: few coefficients may not show it yet.  The coefficients after K count too, which matters where they
    hardly fall (a geometric series), unless what is seen is round-off: ``sizes`` are sums of moduli behind ``rows``.
    """
    total, slowest = 0.0, 0.0
    for group in rule.groups:
        n1, n2, n3, n4 = rows[group.start : group.start + 4]
        ratio = group.ratio
        if n3 > 0:
            ratio = max(ratio, math.sqrt(n1 / n3))
        if n4 > 0:
            ratio = max(ratio, math.sqrt(n2 / n4))
        ratio = min(ratio, 1.0)
        worst = 0.0
        for z, size in enumerate((n1, n2, n3, n4)):
            carried = ratio ** (z + group.steps)
            if order > 0 and group.degree > z:
                powers = ((group.degree + group.steps) / (group.degree - z)) ** order
                carried = max(carried, min(1.0, group.ratio ** (z + group.steps) * powers))
            worst = max(worst, size * carried)
        if max(n1, n2) > NOISE * EPSILON * float(sizes[group.start : group.start + 2].max()):
            worst *= max(1.0, 0.5 / (1.0 - min(ratio, SLOWEST)))
        total += worst
        slowest = max(slowest, ratio)
    return total, slowest


def singular_order(data: ChordData) -> NDArray[np.float64]:
    """For every chord the order of the singularity that deep chords beside it can cause in its variable.

    Integrating ``t_2^(Y_2 - 1) (1 + t_1 + t_2)^A`` over ``t_2`` from 0 leaves ``(1 + t_1)^(A + Y_2)``: with Re Y_2 < 0
    worse than what was there.  The largest sum of depths of the other chords over the sectors that have the chord.
    """
    variables = sector_table(data.n).variables
    depth = np.array([max(0.0, -y.real) for y in data.chords])
    own = depth[variables]
    orders = np.zeros(len(depth))
    np.maximum.at(orders, variables, own.sum(axis=1, keepdims=True) - own)
    return orders


def run(data: ChordData, layout: Layout, threads: int = 1) -> Outcome:
    """Integrate with the given rules.

    Parameters
    ----------
    data
        Exponents.
    layout
        The rules and where they are used.
    threads
        Python threads (kernels release the interpreter lock); the result does not depend on it.
    """
    # overflow to infinity is a finding, not a fault: `Outcome.finite` looks for it
    with np.errstate(all="ignore"):
        return _run(data, layout, threads)


def _run(data: ChordData, layout: Layout, threads: int) -> Outcome:
    table = sector_table(data.n)
    rules = layout.rules
    real_rule = np.array([rule.is_real for rule in rules])
    chosen = layout.sectors
    complex_sector = ~real_rule[layout.rows[chosen]].all(axis=1) if data.is_real else np.ones(len(chosen), dtype=bool)
    width = max(rule.count for rule in rules)
    counts = np.array([rule.count for rule in rules], dtype=np.int64)
    real_result = data.is_real and all(y.is_real for y in data.chords)
    total: complex = 0.0
    absolute = square = 0.0
    least = math.inf
    points = 0
    null_rows = max(rule.nulls.shape[0] for rule in rules)
    null_sums = np.zeros((len(rules), null_rows))
    null_sizes = np.zeros((len(rules), null_rows))
    noise_sums = np.zeros((len(rules), width))

    for is_complex in (False, True):
        sectors = chosen[complex_sector == is_complex]
        if not len(sectors):
            continue
        variables, all_rules, all_counts = layout.rows, list(rules), counts
        symmetric = is_complex and real_result
        if symmetric:
            variables, all_rules = _halved(layout, sectors)
            all_counts = np.array([rule.count for rule in all_rules], dtype=np.int64)
        targets = layout.rows[sectors]
        twins, twin_targets = np.zeros(len(sectors), dtype=bool), targets[:0]
        images = _images(data, layout, sectors)
        if images is not None:
            sectors, twins, twin_targets = images
            targets = layout.rows[sectors]
        chunks = _chunks(table, sectors, variables, all_counts)
        points += int(all_counts[variables[sectors]].prod(axis=1).sum())
        dtype = complex if is_complex else float
        nodes, weights = _pack(all_rules, width, dtype)
        out_abs = np.zeros(len(chunks))
        out_square = np.zeros(len(chunks))
        out_marginal = np.zeros((len(chunks), table.variables.shape[1], width), dtype=dtype)
        out_least = np.full(len(chunks), math.inf)
        exponents = data.run_exponents.astype(dtype)
        arguments = (chunks, *_table_arguments(table, variables), exponents, all_counts, nodes, weights)
        outputs: tuple[Any, ...] = (out_abs, out_square, out_marginal)
        if is_complex:
            from ..kernels.disk_complex import integrate_chunks as kernel

            outputs += (out_least,)
        else:
            from ..kernels.disk_real import integrate_chunks as kernel

        _spread(len(chunks), threads, lambda lo, hi, k=kernel, a=arguments, o=outputs: k(lo, hi, *a, *o))
        least = min(least, float(out_least.min()))
        starts = np.flatnonzero(np.diff(chunks[:, 0], prepend=-1))  # chunks of a sector stand together
        copies = np.where(twins, 2.0, 1.0)  # the errors of twins are the same, so their squares count four times
        absolute += float((np.add.reduceat(out_abs, starts) * copies).sum())
        square += float((np.add.reduceat(out_square, starts) * copies**2).sum())
        marginal = np.add.reduceat(out_marginal, starts, axis=0)
        rows = variables[sectors]
        terms = weights[rows] * marginal
        noise_table = np.zeros((len(all_rules), width))
        for row, rule in enumerate(all_rules):
            noise_table[row, : rule.count] = rule.noise
        noise = noise_table[rows] * np.abs(marginal)
        null_table = np.zeros((len(all_rules), null_rows, width), dtype=dtype)
        for row, rule in enumerate(all_rules):
            if is_complex or rule.is_real:
                null_table[row, : rule.nulls.shape[0], : rule.count] = rule.nulls
        nulls = np.einsum("svzw,svw->svz", null_table[rows], marginal)
        if symmetric:
            terms, nulls = terms.real, nulls.real
        total += (terms[:, 0].sum(axis=1) * copies).sum()
        sizes = np.einsum("svzw,svw->svz", np.abs(null_table)[rows], np.abs(marginal))
        for which, places in ((slice(None), targets), (twins, twin_targets)):
            np.add.at(noise_sums, places, noise[which])
            np.add.at(null_sums, places, np.abs(nulls[which]))
            np.add.at(null_sizes, places, sizes[which])

    truncation = np.zeros(table.chord_count)
    decay = np.zeros(table.chord_count)
    orders = singular_order(data)
    for k, (c, rule) in enumerate(zip(layout.chord.tolist(), rules, strict=True)):
        error, ratio = _extrapolate(rule, null_sums[k], null_sizes[k], float(orders[c]))
        truncation[c] += error
        decay[c] = max(decay[c], ratio)
    total = complex(total)
    return Outcome(
        value=total.real if real_result else total,
        absolute=absolute,
        square=math.sqrt(square),
        weight_noise=float(np.sqrt((noise_sums**2).sum())),
        weight_noise_sum=float(noise_sums.sum()),
        truncation=truncation,
        decay=decay,
        least=least,
        points=points,
    )


def _images(
    data: ChordData, layout: Layout, sectors: NDArray[np.int64]
) -> tuple[NDArray[np.int64], NDArray[np.bool_], NDArray[np.int32]] | None:
    """One sector of each pair that reversing the order exchanges, when exponents and rules do not change by it.

    Returns the sectors to do, which of them stand for two, and the rows of rules that belong to the others.
    """
    if not data.is_symmetric:
        return None
    partner, place = mirror(data.n)
    first: dict[int, int] = {}
    same = np.array([first.setdefault(id(rule), k) for k, rule in enumerate(layout.rules)])
    mirrored = np.take_along_axis(layout.rows[partner], place, axis=1)[sectors]
    if set(partner[sectors].tolist()) != set(sectors.tolist()) or (same[mirrored] != same[layout.rows[sectors]]).any():
        return None
    keep = sectors <= partner[sectors]
    twins = (sectors < partner[sectors])[keep]
    return sectors[keep], twins, mirrored[keep][twins]


def _halved(layout: Layout, sectors: NDArray[np.int64]) -> tuple[NDArray[np.int32], list[Rule]]:
    """Rows with one conjugate-paired rule per sector replaced by its upper half, appended to the rules."""
    rules = list(layout.rules)
    rows = layout.rows.copy()
    half_row: dict[int, int] = {}
    paired = np.array([rule.conjugate_pairs and not rule.is_real for rule in rules])
    counts = np.array([rule.count for rule in rules])
    for s in sectors.tolist():
        row = layout.rows[s]
        candidates = [v for v in range(len(row)) if paired[row[v]]]
        if not candidates:
            continue
        v = max(candidates, key=lambda v: counts[row[v]])
        full = int(row[v])
        if full not in half_row:
            half_row[full] = len(rules)
            rules.append(rules[full].upper_half())
        rows[s, v] = half_row[full]
    return rows, rules
