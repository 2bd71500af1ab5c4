"""Many small real disk integrals, each from its exponents to a value with its errors, without leaving compiled code.

The rules are endpoint-subtracted Gauss rules for every chord; plan, error estimate and refinement are those of
``disk.evaluate`` written out for arrays.  A point that does not come out as asked is left to that module.  Points do
not know of each other, so a batch gives the bits of single calls.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit

from .disk_real import integrate_chunks
from .radau import radau

_JIT: Any = {"cache": True, "nogil": True, "error_model": "numpy", "fastmath": {"contract"}}
EPSILON = 2.0**-52
PASSES = 5
DONE, UNDONE = 1, 0


@njit(**_JIT)
def _first_counts(counts, exponents, y1, goal, growth, stretch, trial, fewest, most):
    """Nodes that the one-variable bound of ``disk.plan.first_count`` predicts for every chord; False above ``most``."""
    samples = growth.shape[2]
    half = trial.shape[0]
    level = np.empty(samples)
    for c in range(y1.shape[0]):
        for k in range(samples):
            level[k] = -y1[c] * stretch[c, k]
        for r in range(exponents.shape[0]):
            a = exponents[r]
            if a != 0.0:
                for k in range(samples):
                    level[k] += a * growth[c, r, k]
        top = level[2 * half]
        for k in range(2 * half + 1, samples):
            top = max(top, level[k])
        best = np.inf
        for k in range(half):
            bound = max(level[k], level[half + k]) - top
            best = min(best, (goal + max(bound, 0.0)) / (2.0 * trial[k] * stretch[c, samples]))
        if not best < most:
            return False
        counts[c] = max(np.int64(np.ceil(best)) + 1, fewest)
    return True


@njit(**_JIT)
def _build(counts, y, y1, bends, tables, spans, nodes, weights, nulls, noise, scratch):
    for c in range(y.shape[0]):
        if not radau(
            y[c], y1[c], bends[c], counts[c], tables, spans, nodes[c], weights[c], nulls[c], noise[c], scratch
        ):
            return False
    return True


@njit(**_JIT)
def _value(variables, counts, weights, marginal):
    total = 0.0
    for s in range(variables.shape[0]):
        c = variables[s, 0]
        part = 0.0
        for w in range(counts[c]):
            part += weights[c, w] * marginal[s, 0, w]
        total += part
    return total


@njit(**_JIT)
def _truncation(variables, counts, nulls, marginal, ratios, orders, shared, single, sums, errors, decay):
    """Errors of the rules and decay of their coefficients, as ``disk.run`` extrapolates them."""
    sums[:] = 0.0
    for s in range(variables.shape[0]):
        for v in range(variables.shape[1]):
            c = variables[s, v]
            for z in range(4):
                part = 0.0
                for w in range(counts[c]):
                    part += nulls[c, z, w] * marginal[s, v, w]
                sums[c, z] += abs(part)
    total = 0.0
    largest = 0.0
    for c in range(counts.shape[0]):
        ratio = ratios[c]
        if sums[c, 2] > 0.0:
            ratio = max(ratio, np.sqrt(sums[c, 0] / sums[c, 2]))
        if sums[c, 3] > 0.0:
            ratio = max(ratio, np.sqrt(sums[c, 1] / sums[c, 3]))
        ratio = min(ratio, 1.0)
        steps = float(counts[c])
        degree = counts[c] - 2.0
        worst = 0.0
        carried = ratio ** (steps)
        theory = ratios[c] ** (steps)
        for z in range(4):
            factor = carried
            if orders[c] > 0.0 and degree > z:
                powers = ((degree + steps) / (degree - z)) ** orders[c]
                factor = max(carried, min(1.0, theory * powers))
            worst = max(worst, sums[c, z] * factor)
            carried *= ratio
            theory *= ratios[c]
        worst *= max(1.0, 0.5 / (1.0 - min(ratio, 0.999)))
        errors[c] = worst
        decay[c] = ratio
        total += worst
        largest = max(largest, worst)
    return shared * total + single * largest


@njit(**_JIT)
def _grow(variables, counts, errors, decay, shared, single, goal, most):
    """More nodes, each to the chord that takes off most error for the points it adds; False when that is not enough."""
    chords = counts.shape[0]
    shares = np.zeros(chords)
    for s in range(variables.shape[0]):
        points = 1.0
        for v in range(variables.shape[1]):
            points *= counts[variables[s, v]]
        for v in range(variables.shape[1]):
            shares[variables[s, v]] += points / counts[variables[s, v]]
    gain = np.empty(chords)
    left = np.empty(chords)
    for c in range(chords):
        gain[c] = 1.0 - min(max(decay[c], 1e-9), 0.98) ** 2
        left[c] = errors[c]
    grown = False
    for _ in range(16 * chords):
        total = 0.0
        largest = 0.0
        best = -1
        most_off = 0.0
        for c in range(chords):
            total += left[c]
            largest = max(largest, left[c])
            off = left[c] * gain[c] / shares[c]
            if off > most_off:
                most_off = off
                best = c
        if not shared * total + single * largest > goal or best < 0:
            break
        left[best] *= 1.0 - gain[best]
        counts[best] += 1
        grown = True
        if counts[best] > most:
            return False
    return grown


@njit(**_JIT)
def integrate_points(
    first,
    last,
    chunks,
    variables,
    masks_prev,
    masks_var,
    mask_count,
    run_index,
    run_bounds,
    run_split,
    term_start,
    term_mask,
    term_class,
    run_logs,
    bends,
    ratios,
    growth,
    stretch,
    trial,
    shakes,
    tables,
    spans,
    exponents,
    y,
    y1,
    rtol,
    atol,
    goal,
    probe_goal,
    shared,
    single,
    sigmas,
    probe,
    most_points,
    out_value,
    out_errors,
    out_points,
    out_counts,
    out_sizes,
    out_passes,
    out_state,
):
    """Integrate the points ``first..last-1``.

    Parameters
    ----------
    chunks : (S, 3) int64
        One row for every sector: its number, 0, and room for the number of its outer points.
    variables .. term_class
        The sector table, see ``disk.sectors``.
    run_logs : (runs,) float64
        Logarithm of the number of gaps of each run.
    bends, ratios : (chords,) float64
        Of the variable of each chord, and the decay of coefficients in it.
    growth : (chords, runs, K), stretch : (chords, K + 1), trial : (T,) float64
        Samples for the first plan, see ``disk.points``.
    shakes : (probes, runs) float64
        Relative changes of the exponents, of order one.
    tables, spans
        See ``kernels.radau``.
    exponents : (P, runs), y, y1 : (P, chords) float64
        The exponents of all runs, of all chords, and the latter plus one, each correctly rounded.
    rtol, atol, goal, probe_goal, shared, single, sigmas, probe
        The request and the constants of ``disk.evaluate``.
    most_points : float
        Evaluations of one pass that a point may take here.
    out_value : (P,); out_errors : (P, 2) truncation and round-off; out_points : (P,); out_counts : (P, chords);
    out_sizes : (P, chords) sum of the moduli of the weights; out_passes : (P,); out_state : (P,) uint8
        Results; state 1 where the errors meet the request, 0 where the point is left to others.
    """
    chord_count = y.shape[1]
    sector_count = variables.shape[0]
    variable_count = variables.shape[1]
    outer = max(0, variable_count - 2)
    most = spans.shape[0] - 1
    width = (most + 1 + 3) // 4 * 4 + 4
    nodes = np.ones((chord_count, width))
    weights = np.zeros((chord_count, width))
    nulls = np.zeros((chord_count, 4, width))
    noise = np.zeros((chord_count, width))
    scratch = np.zeros((12, width))
    marginal = np.zeros((sector_count, variable_count, width))
    out_abs = np.zeros(sector_count)
    out_square = np.zeros(sector_count)
    sums = np.zeros((chord_count, 4))
    noises = np.zeros((chord_count, width))
    errors = np.zeros(chord_count)
    decay = np.zeros(chord_count)
    orders = np.zeros(chord_count)
    counts = np.zeros(chord_count, dtype=np.int64)
    fewer = np.zeros(chord_count, dtype=np.int64)
    ranges = chunks.copy()
    shaken = np.empty(exponents.shape[1])

    for point in range(first, last):
        out_state[point] = UNDONE
        if not _first_counts(counts, exponents[point], y1[point], goal, growth, stretch, trial, 5, most):
            continue
        spread = 0.0
        for r in range(exponents.shape[1]):
            spread += abs(exponents[point, r]) * run_logs[r]
        orders[:] = 0.0
        for s in range(sector_count):
            depth = 0.0
            for v in range(variable_count):
                depth += max(0.0, -y[point, variables[s, v]])
            if depth > 0.0:
                for v in range(variable_count):
                    c = variables[s, v]
                    orders[c] = max(orders[c], depth - max(0.0, -y[point, c]))
        spent = 0
        for attempt in range(1, PASSES + 1):
            points = 0
            for s in range(sector_count):
                rows = 1
                for u in range(outer):
                    rows *= counts[variables[s, u]]
                ranges[s, 2] = rows
                for v in range(outer, variable_count):
                    rows *= counts[variables[s, v]]
                points += rows
            if points > most_points:
                break
            if not _build(counts, y[point], y1[point], bends, tables, spans, nodes, weights, nulls, noise, scratch):
                break
            integrate_chunks(
                0,
                sector_count,
                ranges,
                variables,
                masks_prev,
                masks_var,
                mask_count,
                run_index,
                run_bounds,
                run_split,
                term_start,
                term_mask,
                term_class,
                exponents[point],
                counts,
                nodes,
                weights,
                out_abs,
                out_square,
                marginal,
            )
            spent += points
            for c in range(chord_count):
                size = 0.0
                for w in range(counts[c]):
                    size += abs(weights[c, w])
                out_sizes[point, c] = size
            value = _value(variables, counts, weights, marginal)
            truncation = _truncation(
                variables, counts, nulls, marginal, ratios, orders, shared, single, sums, errors, decay
            )
            absolute = 0.0
            square = 0.0
            for s in range(sector_count):
                absolute += out_abs[s]
                square += out_square[s]
            noises[:] = 0.0
            for s in range(sector_count):
                for v in range(variable_count):
                    c = variables[s, v]
                    for w in range(counts[c]):
                        noises[c, w] += noise[c, w] * abs(marginal[s, v, w])
            noise_sum = 0.0
            noise_square = 0.0
            for c in range(chord_count):
                for w in range(counts[c]):
                    noise_sum += noises[c, w]
                    noise_square += noises[c, w] * noises[c, w]
            worst = EPSILON * ((8.0 + spread) * absolute + noise_sum)
            target = max(atol, rtol * abs(value))
            likely = sigmas * EPSILON * (np.sqrt(noise_square) + (4.0 + 0.5 * spread) * np.sqrt(square))
            likely = min(worst, likely)
            settled = worst <= 0.1 * target or (worst <= target and truncation + worst <= target) or likely == worst
            if settled:
                likely = worst
            if not (np.isfinite(value) and np.isfinite(truncation) and np.isfinite(worst)):
                break
            if truncation + likely <= target:
                roundoff = likely
                if not settled:
                    # what the rounding of the exponents costs is measured with few nodes and large changes
                    if not _first_counts(
                        fewer, exponents[point], y1[point], probe_goal, growth, stretch, trial, 5, most
                    ):
                        break
                    rows_sum = 0
                    for c in range(chord_count):
                        fewer[c] = min(fewer[c], counts[c])
                    for s in range(sector_count):
                        rows = 1
                        for u in range(outer):
                            rows *= fewer[variables[s, u]]
                        ranges[s, 2] = rows
                        for v in range(outer, variable_count):
                            rows *= fewer[variables[s, v]]
                        rows_sum += rows
                    if not _build(
                        fewer, y[point], y1[point], bends, tables, spans, nodes, weights, nulls, noise, scratch
                    ):
                        break
                    middle = 0.0
                    largest = 0.0
                    for k in range(shakes.shape[0] + 1):
                        for r in range(shaken.shape[0]):
                            change = probe * shakes[k - 1, r] if k > 0 else 0.0
                            shaken[r] = exponents[point, r] * (1.0 + change)
                        integrate_chunks(
                            0,
                            sector_count,
                            ranges,
                            variables,
                            masks_prev,
                            masks_var,
                            mask_count,
                            run_index,
                            run_bounds,
                            run_split,
                            term_start,
                            term_mask,
                            term_class,
                            shaken,
                            fewer,
                            nodes,
                            weights,
                            out_abs,
                            out_square,
                            marginal,
                        )
                        spent += rows_sum
                        trial_value = _value(variables, fewer, weights, marginal)
                        if k == 0:
                            middle = trial_value
                        elif not np.isfinite(trial_value):
                            largest = np.inf
                        else:
                            largest = max(largest, abs(trial_value - middle) / probe)
                    roundoff = min(worst, likely + sigmas * EPSILON * largest)
                if truncation + roundoff <= target:
                    out_value[point] = value
                    out_errors[point, 0] = truncation
                    out_errors[point, 1] = roundoff
                    for c in range(chord_count):
                        out_counts[point, c] = counts[c]
                    out_points[point] = spent
                    out_passes[point] = attempt
                    out_state[point] = DONE
                break  # more nodes do not help against round-off
            if likely > 0.9 * target:
                break
            if not _grow(variables, counts, errors, decay, shared, single, 0.6 * max(target, likely), most):
                break
