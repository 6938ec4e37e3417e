"""Brute force: every sign change of a function of time, found by fine sampling and closed by bisection.

The functions come in two shapes, both in integer nanoseconds of UTC:
`grid(times) -> (times, columns)` and `pairs(times, columns) -> (times,)`.
"""

import numpy as np

CLOSE_ENOUGH_NS = 64


def bisect(pairs, low, high, column):
    """Roots between `low` and `high`, where `pairs` differs in sign; int64 nanoseconds, to 64 ns."""
    low, high = low.copy(), high.copy()
    if len(low) == 0:
        return low
    positive = pairs(low, column) > 0.0
    while np.max(high - low) > CLOSE_ENOUGH_NS:
        middle = low + (high - low) // 2
        same = (pairs(middle, column) > 0.0) == positive
        low, high = np.where(same, middle, low), np.where(same, high, middle)
    return low + (high - low) // 2


def _extremum(pairs, low, high, column, sign):
    """Where `sign * pairs` is greatest between `low` and `high`, by golden section, to a millisecond."""
    golden = (np.sqrt(5.0) - 1.0) / 2.0
    low, high = low.astype(np.int64), high.astype(np.int64)
    while np.max(high - low) > 1_000_000:
        span = high - low
        left, right = high - (span * golden).astype(np.int64), low + (span * golden).astype(np.int64)
        right_wins = sign * pairs(right, column) > sign * pairs(left, column)
        low, high = np.where(right_wins, left, low), np.where(right_wins, high, right)
    return low + (high - low) // 2


def sign_changes(grid, pairs, times, *, values=None):
    """All roots, the columns they belong to and their direction (+1 upward, −1 downward).

    Sorted by column and time. Between samples an extremum that comes near zero is sought out, so that a
    graze is not missed.
    """
    values = grid(times) if values is None else values
    rows, columns = np.nonzero((values[:-1] > 0.0) != (values[1:] > 0.0))
    low, high, column = [times[rows]], [times[rows + 1]], [columns]
    left, middle, right = values[:-2], values[1:-1], values[2:]
    sign = np.where(middle > 0.0, -1.0, 1.0)
    peak = (sign * middle >= sign * left) & (sign * middle > sign * right)
    reach = np.maximum(np.abs(middle - left), np.abs(middle - right))
    rows, columns = np.nonzero(peak & (np.abs(middle) < 2.0 * reach))
    if len(rows):
        sign = sign[rows, columns]
        top = _extremum(pairs, times[rows], times[rows + 2], columns, sign)
        over = sign * pairs(top, columns) > 0.0
        below = sign * np.stack([values[rows, columns], values[rows + 2, columns]]) <= 0.0
        over &= below.all(axis=0)
        for ends in ((times[rows], top), (top, times[rows + 2])):
            low.append(ends[0][over])
            high.append(ends[1][over])
            column.append(columns[over])
    low, high, column = (np.concatenate(part) for part in (low, high, column))
    direction = np.where(pairs(low, column) > 0.0, -1, 1) if len(low) else np.empty(0, dtype=int)
    root = bisect(pairs, low, high, column)
    order = np.lexsort((root, column))
    return root[order], column[order], direction[order]


def grid_times(start_ns, stop_ns, step_s):
    """Samples from start to stop, both included, at most `step_s` apart."""
    count = int(np.ceil((stop_ns - start_ns) / (step_s * 1e9))) + 1
    return np.linspace(0, stop_ns - start_ns, count).astype(np.int64) + np.int64(start_ns)
