"""Completing and repairing pair values under ``sum_j s_ij = R_i``.

The row equations are linear with coefficients 0 and 1; which pairs are known decides everything, so the elimination is
done once per pattern of known pairs and kept.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache

from .channels import Pair, dotted, pair_index, pair_order
from .errors import InputError
from .exact import ONE, ZERO, Exact

SLACK = 1e-10  # how far floating-point input may miss conservation, relative to the largest value


@dataclass(frozen=True, eq=False)
class _Pattern:
    """The eliminated row equations for one set of known pairs.

    Attributes
    ----------
    solved : missing pair -> (coefficients of the known pairs, coefficients of the rows)
    checks : equations among known pairs and rows that must vanish: (known coefficients, row coefficients)
    free : a missing pair that the rows do not fix, None when there is none
    """

    solved: tuple[tuple[int, dict[int, Fraction], dict[int, Fraction]], ...]
    checks: tuple[tuple[dict[int, Fraction], dict[int, Fraction]], ...]
    free: Pair | None


@lru_cache(maxsize=512)
def _pattern(n: int, known: frozenset[int]) -> _Pattern:
    order = pair_order(n)
    missing = [k for k in range(len(order)) if k not in known]
    # rows: sum over missing = R_i - sum over known
    rows = []
    for i in range(1, n + 1):
        inside = [k for k, pair in enumerate(order) if i in pair]
        left = {k: Fraction(1) for k in inside if k not in known}
        right = {k: Fraction(-1) for k in inside if k in known}
        rows.append((left, right, {i: Fraction(1)}))
    pivots: list[tuple[int, dict[int, Fraction], dict[int, Fraction], dict[int, Fraction]]] = []
    for left, right, row in rows:
        left, right, row = dict(left), dict(right), dict(row)
        for pivot, *equation in pivots:
            _subtract((left, right, row), equation, left.get(pivot, Fraction(0)))
        column = next((k for k in missing if left.get(k)), None)
        if column is None:
            pivots.append((-1, left, right, row))
            continue
        scale = 1 / left[column]
        left, right, row = ({k: v * scale for k, v in part.items()} for part in (left, right, row))
        equation_now = (left, right, row)
        for place, (pivot, *equation) in enumerate(pivots):
            factor = equation[0].get(column, Fraction(0))
            parts = [dict(part) for part in equation]
            _subtract(parts, equation_now, factor)
            pivots[place] = (pivot, parts[0], parts[1], parts[2])
        pivots.append((column, left, right, row))
    checks = tuple((dict(right), dict(row)) for pivot, _, right, row in pivots if pivot < 0)
    solved = []
    free: Pair | None = None
    for pivot, left, right, row in pivots:
        if pivot < 0:
            continue
        loose = [k for k, v in left.items() if v and k != pivot]
        if loose:
            free = order[loose[0]]
        solved.append((pivot, {k: v for k, v in right.items() if v}, {k: v for k, v in row.items() if v}))
    if free is None:
        done = {pivot for pivot, *_ in solved}
        free = next((order[k] for k in missing if k not in done), None)
    return _Pattern(tuple(solved), checks, free)


def _subtract(
    target: Sequence[dict[int, Fraction]], equation: Sequence[Mapping[int, Fraction]], factor: Fraction
) -> None:
    if not factor:
        return
    for into, part in zip(target, equation, strict=True):
        for k, v in part.items():
            into[k] = into.get(k, Fraction(0)) - factor * v


def _combine(coefficients: Mapping[int, Fraction], values: Mapping[int, Exact]) -> Exact:
    total = ZERO
    for k, c in coefficients.items():
        if c == 1:
            total = total + values[k]
        elif c == -1:
            total = total - values[k]
        elif c:
            total = total + c * values[k]
    return total


def completed(
    n: int,
    given: Mapping[Pair, tuple[Exact, bool]],
    row_sums: Sequence[Exact],
    field: str = "pairs",
) -> tuple[tuple[Exact, ...], float]:
    """All pair values from some of them.

    Parameters
    ----------
    n
        Number of punctures.
    given
        pair (i < j) -> (value, whether it came as a floating-point number).
    row_sums
        R_1..R_n.
    field
        Name of the input for errors.

    Returns
    -------
    (values, shift)
        In the order of ``pair_order(n)``; the largest change that floating-point values needed to conserve exactly.

    Raises
    ------
    InputError
        When the pairs do not fix the others, or contradict the row sums.
    """
    index = pair_index(n)
    values = {index[pair]: value for pair, (value, _) in given.items()}
    rounded = frozenset(index[pair] for pair, (_, flag) in given.items() if flag)
    pattern = _pattern(n, frozenset(values))
    if pattern.free is not None:
        raise InputError(field, f"no value for the pair {pattern.free}", "enough pairs to fix the rest by conservation")
    rows = dict(enumerate(row_sums, start=1))
    shift = 0.0
    misses = [_combine(left, values) + _combine(right, rows) for left, right in pattern.checks]
    if any(misses):
        scale = max([abs(value) for value in values.values()] + [abs(r) for r in row_sums])
        worst = max(abs(miss) for miss in misses)
        if not rounded or worst > SLACK * n * scale:
            raise _contradiction(n, values, rows, field, worst)
        change = _projection(pattern, misses, tuple(sorted(rounded)))
        if change is None:
            raise _contradiction(n, values, rows, field, worst)
        for k, delta in change.items():
            values[k] = values[k] + delta
            shift = max(shift, abs(delta))
    for k, left, right in pattern.solved:
        values[k] = _combine(left, values) + _combine(right, rows)
    return tuple(values[k] for k in range(len(index) // 2)), shift


def _contradiction(
    n: int, values: Mapping[int, Exact], rows: Mapping[int, Exact], field: str, worst: float
) -> InputError:
    order = pair_order(n)
    if len(values) == len(order):
        for i in range(1, n + 1):
            total = sum((values[k] for k, pair in enumerate(order) if i in pair), ZERO)
            if total != rows[i]:
                return InputError("row_sums", f"row {i} of {field} sums to {total}", f"{rows[i]}")
    return InputError(field, f"values that contradict conservation by {worst:.3g}", "values with the declared row sums")


def _projection(pattern: _Pattern, misses: Sequence[Exact], rounded: tuple[int, ...]) -> dict[int, Exact] | None:
    """The least change (sum of squares) of the rounded values that makes every check vanish; None if there is none."""
    matrix, inverse = _least_squares(pattern, rounded)
    if inverse is None:
        gram = [[sum((a * b for a, b in zip(r, s, strict=True)), Fraction(0)) for s in matrix] for r in matrix]
        weights = _solve(gram, list(misses))
        if weights is None:
            return None
        inverse, misses = tuple(zip(*matrix, strict=True)), weights
    change = {}
    for k, row in zip(rounded, inverse, strict=True):
        delta = ZERO
        for c, miss in zip(row, misses, strict=True):
            if c:
                delta = delta - c * miss
        change[k] = delta
    return change


@lru_cache(maxsize=512)
def _least_squares(
    pattern: _Pattern, rounded: tuple[int, ...]
) -> tuple[tuple[tuple[Fraction, ...], ...], tuple[tuple[Fraction, ...], ...] | None]:
    """The checks as a matrix M on the rounded values, and ``M^T (M M^T)^-1`` (None when M M^T is singular).

    Scans project thousands of points with the same pattern.
    """
    matrix = tuple(tuple(left.get(k, Fraction(0)) for k in rounded) for left, _ in pattern.checks)
    gram = [[sum((a * b for a, b in zip(r, s, strict=True)), Fraction(0)) for s in matrix] for r in matrix]
    columns = []
    for place in range(len(gram)):
        unit = [ONE if k == place else ZERO for k in range(len(gram))]
        solved = _solve(gram, unit)
        if solved is None:
            return matrix, None
        columns.append([value.re for value in solved])
    size = range(len(gram))
    inverse = tuple(
        tuple(sum((matrix[i][column] * columns[k][i] for i in size), Fraction(0)) for k in size)
        for column in range(len(rounded))
    )
    return matrix, inverse


def _solve(matrix: list[list[Fraction]], right: list[Exact]) -> list[Exact] | None:
    """Exact Gaussian elimination of a symmetric system that may be singular; None when it has no solution."""
    size = len(matrix)
    rows = [list(row) for row in matrix]
    values = list(right)
    pivots: list[tuple[int, int]] = []
    used: set[int] = set()
    for column in range(size):
        place = next((r for r in range(size) if r not in used and rows[r][column]), None)
        if place is None:
            continue
        used.add(place)
        pivots.append((place, column))
        for r in range(size):
            if r != place and rows[r][column]:
                factor = rows[r][column] / rows[place][column]
                rows[r] = [a - factor * b for a, b in zip(rows[r], rows[place], strict=True)]
                values[r] = values[r] - factor * values[place]
    if any(values[r] for r in range(size) if r not in used):
        return None
    solution = [ZERO] * size
    for place, column in pivots:
        solution[column] = values[place] / rows[place][column]
    return solution


def shown_pair(pair: Pair) -> str:
    """A pair in an error message."""
    return f"s_{dotted(pair)}"
