"""The interval algebra against plain membership of instants."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from exceed.core import intervals as iv

ENDS = st.integers(0, 40)
SETS = st.lists(st.tuples(ENDS, ENDS), max_size=8).map(
    lambda rows: iv.normal([float(a) for a, _ in rows], [float(b) for _, b in rows])
)
# between whole-numbered edges nothing changes, so midpoints tell everything
POINTS = np.arange(-1, 42) + 0.5


def has(of: iv.Intervals) -> np.ndarray:
    return of.contains(POINTS)


@given(SETS)
def test_a_set_is_ascending_disjoint_and_parted(of):
    assert (of.end > of.start).all()
    assert (of.start[1:] > of.end[:-1]).all()


@given(SETS, SETS)
def test_union_holds_where_either_holds(a, b):
    assert (has(iv.union(a, b)) == (has(a) | has(b))).all()


@given(SETS, SETS)
def test_intersection_holds_where_both_hold(a, b):
    assert (has(iv.intersection(a, b)) == (has(a) & has(b))).all()


@given(SETS, SETS)
def test_difference_is_what_the_other_leaves(a, b):
    assert (has(iv.difference(b, a)) == (has(a) & ~has(b))).all()


@given(SETS, SETS)
def test_de_morgan_within_a_frame(a, b):
    frame = iv.normal([-1.0], [42.0])
    left = iv.complement(iv.union(a, b), frame)
    right = iv.intersection(iv.complement(a, frame), iv.complement(b, frame))
    assert left == right


@given(st.lists(SETS, min_size=1, max_size=4), st.integers(1, 4))
def test_at_least_counts_the_sets_that_hold(sets, count):
    depth = sum(has(s).astype(int) for s in sets)
    assert (has(iv.at_least(count, sets)) == (depth >= count)).all()


@given(SETS, st.integers(0, 10))
def test_joining_fills_exactly_the_short_gaps(of, gap):
    joined = iv.joined(of, float(gap))
    assert joined.total >= of.total
    assert (has(joined) >= has(of)).all()
    assert (joined.start[1:] - joined.end[:-1] >= gap).all()


@given(SETS, SETS)
def test_joining_never_crosses_what_must_stay_apart(of, wall):
    wall = iv.difference(of, wall)  # a wall only stands between stretches
    joined = iv.joined(of, 100.0, wall)
    assert not (has(joined) & has(wall)).any()


@given(SETS, st.integers(0, 10))
def test_lasting_keeps_the_long_ones_whole(of, least):
    kept = iv.lasting(of, float(least))
    assert set(kept) == {row for row in of if row[1] - row[0] >= least}


@given(st.lists(st.booleans(), max_size=30))
def test_runs_of_a_mask_rebuild_the_mask(bits):
    mask = np.array(bits, dtype=bool)
    again = np.zeros(len(mask), dtype=bool)
    for start, stop in iv.runs(mask):
        again[start:stop] = True
    assert (again == mask).all()


@given(SETS, SETS)
def test_touching_is_overlap(a, b):
    found = iv.touching(a, b)
    slow = [any(s < e2 and s2 < e for s2, e2 in b) for s, e in a]
    assert found.tolist() == slow


@given(SETS)
def test_total_is_the_number_of_unit_cells(of):
    assert of.total == float(has(of).sum())
