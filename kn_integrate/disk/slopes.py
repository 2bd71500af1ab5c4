r"""Derivatives of a disk integral with respect to all chord exponents at once, from one pass over the sectors.

In a sector the integrand is ``prod_v t_v^(Y_v - 1) prod_runs P_run^A_run``.  With ``T_(a,b)`` the exponent Y of the
chord of run (a, b) less its size, inclusion and exclusion gives back the exponents of the runs,

    ``A_(a,b) = T_(a,b) - T_(a+1,b) - T_(a,b-1) + T_(a+1,b-1)``,

so Y_c enters its own endpoint power and at most four runs, with coefficients 1 and -1:

    ``dI/dY_c = sum over sectors with the chord c [log t_c inserted] + sum_runs (dA_run/dY_c) [log P_run inserted]``.

The first insertion is the derivative of the rule in its exponent (``rules.logs``), the second a sum that the kernel
makes beside the value.  Both together are the derivative of what the rules give for the integral, an analytic function
of the exponents with an analytic error, so its truncation error is that of the value times a logarithmic derivative.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .chords import ChordData
from .rules.logs import LogRule, log_rule
from .run import EPSILON, Layout, _chunks, _spread
from .sectors import runs_of, sector_table


@dataclass(frozen=True)
class Slopes:
    """Value and derivatives of one integral for given rules.

    Attributes
    ----------
    value : float | complex
    slopes : (chords,) array
        ``dI/dY_c``, in the order of the runs.
    absolute : float
        Sum of the moduli of all terms of the value.
    roundoff : (chords,) array
        Bounds on the round-off of the slopes.
    speed : (chords,) array
        Moduli of the terms of the derivative relative to those of the value, in the sector where that is largest: how
        fast anything that is proportional to weights and integrand can change.  (Not over all sectors together: one
        next to a pole would hide what goes on in the others.)
    points : int
    finite : bool
        True when every number is finite and every logarithm on its right branch.
    """

    value: float | complex
    slopes: NDArray[Any]
    absolute: float
    roundoff: NDArray[np.float64]
    speed: NDArray[np.float64]
    points: int
    finite: bool


@cache
def incidence(n: int) -> NDArray[np.int64]:
    """``dA_run/dY_chord``, shape (runs, chords).

    >>> incidence(4)  # A of the full run is -2 less the two others
    array([[ 1,  0],
           [ 0,  1],
           [-1, -1]])
    """
    runs = runs_of(n - 2)
    place = {run: k for k, run in enumerate(runs)}
    table = np.zeros((len(runs), len(runs)), dtype=np.int64)
    for k, (a, b) in enumerate(runs):
        for run, sign in (((a, b), 1), ((a + 1, b), -1), ((a, b - 1), -1), ((a + 1, b - 1), 1)):
            if run in place:
                table[k, place[run]] += sign
    found = table[:, :-1]  # the full run is no chord: its T is fixed
    found.setflags(write=False)
    return found


def slopes(data: ChordData, layout: Layout, threads: int = 1) -> Slopes:
    """One pass with the given rules, none of them a residue.

    Parameters
    ----------
    data
        Exponents.
    layout
        The rules and where they are used.
    threads
        Python threads; the result does not depend on it.
    """
    with np.errstate(all="ignore"):
        return _pass(data, layout, threads)


def _pass(data: ChordData, layout: Layout, threads: int) -> Slopes:
    from ..kernels.disk_gradient import integrate_chunks as kernel

    table = sector_table(data.n)
    chords = table.chord_count
    runs = runs_of(data.n - 2)
    built = [
        log_rule(rule, data.chords[c], runs[c][1] - runs[c][0] + 1)
        for rule, c in zip(layout.rules, layout.chord.tolist(), strict=True)
    ]
    real_rule = np.array([item.rule.is_real for item in built])
    chosen = layout.sectors
    complex_sector = ~real_rule[layout.rows[chosen]].all(axis=1) if data.is_real else np.ones(len(chosen), dtype=bool)
    real_result = data.is_real and all(y.is_real for y in data.chords)
    value: complex = 0.0
    change = np.zeros(chords, dtype=complex)
    logs = np.zeros(len(runs), dtype=complex)
    absolute = noise = 0.0
    steep, rough, speed = np.zeros(chords), np.zeros(chords), np.zeros(chords)
    points, least = 0, math.inf
    for is_complex in (False, True):
        sectors = chosen[complex_sector == is_complex]
        if not len(sectors):
            continue
        variables, rules = layout.rows, list(built)
        halved = is_complex and real_result
        if halved:
            variables, rules = _upper_halves(layout, sectors, rules)
        packed = _packed(rules, complex if is_complex else float, is_complex)
        rows = variables[sectors]
        counts = np.array([item.rule.count for item in rules], dtype=np.int64)
        chunks = _chunks(table, sectors, variables, counts)
        points += int(counts[rows].prod(axis=1).sum())
        shape = (len(chunks), rows.shape[1], packed.nodes.shape[1])
        kind = packed.nodes.dtype
        out_abs, out_least = np.zeros(len(chunks)), np.zeros(len(chunks))
        out_marginal, out_size = np.zeros(shape, dtype=kind), np.zeros(shape)
        out_logs, out_moved = np.zeros((len(chunks), len(runs)), dtype=kind), np.zeros(shape[:2], dtype=kind)
        arguments = (
            chunks,
            variables,
            table.masks_prev,
            table.masks_var,
            table.mask_count,
            table.run_index,
            table.run_bounds,
            table.term_start,
            table.term_mask,
            table.term_class,
            data.run_exponents.astype(kind),
            counts,
            packed.nodes,
            packed.weights,
            packed.moves,
            np.array([item.moving for item in rules]),
        )
        outputs = (out_abs, out_marginal, out_size, out_logs, out_moved, out_least)
        _spread(len(chunks), threads, lambda lo, hi, a=arguments, o=outputs: kernel(lo, hi, *a, *o))
        least = min(least, float(out_least.min()))
        absolute += float(out_abs.sum())
        starts = np.flatnonzero(np.diff(chunks[:, 0], prepend=-1))
        marginal, size = np.add.reduceat(out_marginal, starts), np.add.reduceat(out_size, starts)
        moved = np.add.reduceat(out_moved, starts)
        terms = (packed.weights[rows] * marginal).sum(axis=2)[:, 0]
        turned = (packed.slopes[rows] * marginal).sum(axis=2) + moved
        summed = out_logs.sum(axis=0)
        if halved:
            terms, turned, summed = terms.real, turned.real, summed.real
        value += terms.sum()
        logs += summed
        # which chord each variable is: rows of layout, which the halves do not change
        place = layout.chord[layout.rows[sectors]]
        np.add.at(change, place, turned)
        noise += float((packed.noise[rows] * np.abs(marginal)).sum())
        ends = (np.abs(packed.slopes)[rows] * size).sum(axis=2)
        drift = (np.abs(packed.moves * packed.weights)[rows] * size).sum(axis=2)
        strength = float(np.abs(data.run_exponents).sum())
        np.add.at(steep, place, ends + strength * drift)
        whole = np.add.reduceat(out_abs, starts)
        np.maximum.at(speed, place, (ends + strength * drift) / np.maximum(whole, 1e-300)[:, None])
        np.add.at(rough, place, (packed.slope_noise[rows] * np.abs(marginal)).sum(axis=2))
    table_of = incidence(data.n)
    found = change + table_of.T @ logs
    sizes = np.array([b - a + 1 for a, b in runs])
    # on the nodes of all rules |log P| is at most this; a single gap has P = 1
    heights = np.where(sizes > 1, np.log(sizes) + (1.0 if real_rule.all() and data.is_real else 2.0), 0.0)
    steep_logs = np.abs(table_of).T @ heights
    units = 8.0 + float(np.abs(data.run_exponents) @ np.log(sizes)) + noise / max(absolute, 1e-300)
    roundoff = EPSILON * (units * (steep + steep_logs * absolute) + rough)
    result: Any = found.real if real_result else found
    total = complex(value).real if real_result else complex(value)
    finite = math.isfinite(abs(total)) and bool(np.isfinite(found).all() and np.isfinite(roundoff).all()) and least > 0
    return Slopes(total, result, absolute, roundoff, speed + steep_logs, points, finite)


@dataclass(frozen=True)
class _Packed:
    """Rules as padded arrays."""

    nodes: NDArray[Any]
    weights: NDArray[Any]
    slopes: NDArray[Any]
    moves: NDArray[Any]
    noise: NDArray[np.float64]
    slope_noise: NDArray[np.float64]


def _packed(rules: list[LogRule], dtype: type, take_complex: bool) -> _Packed:
    shape = (len(rules), max(item.rule.count for item in rules))
    found = _Packed(
        np.ones(shape, dtype=dtype),
        np.zeros(shape, dtype=dtype),
        np.zeros(shape, dtype=dtype),
        np.zeros(shape, dtype=dtype),
        np.zeros(shape),
        np.zeros(shape),
    )
    for row, item in enumerate(rules):
        if not (take_complex or item.rule.is_real):
            continue  # no sector of real nodes uses it
        part = (row, slice(item.rule.count))
        found.nodes[part], found.weights[part] = item.rule.nodes, item.rule.weights
        found.slopes[part], found.moves[part] = item.slopes, item.moves
        found.noise[part], found.slope_noise[part] = item.rule.noise, item.noise
    return found


def _upper_halves(
    layout: Layout, sectors: NDArray[np.int64], rules: list[LogRule]
) -> tuple[NDArray[np.int32], list[LogRule]]:
    """Rows with one conjugate-paired rule per sector replaced by its upper half, appended to the rules."""
    paired = np.array([item.rule.conjugate_pairs and not item.rule.is_real for item in rules])
    counts = np.array([item.rule.count for item in rules])
    length = np.where(paired, counts, 0)[layout.rows]
    widest = length.argmax(axis=1)
    rows, found, half = layout.rows.copy(), list(rules), {}
    for s in sectors.tolist():
        v = int(widest[s])
        if not length[s, v]:
            continue
        full = int(rows[s, v])
        if full not in half:
            half[full] = len(found)
            found.append(rules[full].upper_half())
        rows[s, v] = half[full]
    return rows, found
