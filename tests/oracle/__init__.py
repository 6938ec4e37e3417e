"""Oracles: what the answers should be, worked out without one line of our own code.

Everything here stands on pyerfa, on DE440 read with jplephem, and on numpy. Nothing here imports
`hourarc`: the Earth orientation values alone are handed in by the test, so that both sides turn the same
Earth. `tests/test_oracles.py` holds the oracles against published worked examples and against astropy.
"""
