"""The matrices of the differential equation, against those of the series engine.

That the entries satisfy the equation is checked for that engine, and by every expansion that agrees with quadrature.
"""

from __future__ import annotations

import pytest

from kn_integrate.expansion.steps import step, words
from kn_integrate.kz.pattern import entry_count, step_pattern


@pytest.mark.parametrize("points", [3, 4, 5, 6, 7])
def test_entries_are_those_of_the_series_engine(points):
    # two pieces of code that were written apart: letter k there is label k + 2 here
    m = points - 3
    other, mine = step_pattern(m), step(points)
    index = {pair: k for k, pair in enumerate(mine.basis)}
    rename = [index[tuple(k + 2 for k in a), tuple(k + 2 for k in b)] for a, b in other.splits]
    for entries, half, root in ((mine.first, other.a, 1), (mine.second, other.b, points)):
        want = {}
        for row in range(len(other.splits)):
            word = [int(k) + 2 for k in half.words[row] if k >= 0]
            for k in range(half.start[row], half.start[row + 1]):
                place = int(half.prefix[k])
                pairs = tuple(sorted(tuple(sorted((j, word[place]))) for j in (root, *word[:place])))
                key = (rename[row], rename[int(half.column[k])], int(half.sign[k]), pairs)
                want[key] = want.get(key, 0) + 1
        found = {}
        for row, column, sign, pairs in entries:
            if row != column:
                key = (row, column, sign, tuple(sorted(pairs)))
                found[key] = found.get(key, 0) + 1
        assert found == want
        assert sum(found.values()) == entry_count(m)


def test_words_are_the_rows_without_a_second_word():
    for points in (3, 4, 5, 6):
        assert [a for a, b in step(points).basis if not b] == list(words(points))
