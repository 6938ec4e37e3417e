"""Files in and out: plans, target tables, results, and where every result came from.

Importing this package costs nothing; pyarrow and astropy are imported by the functions that need them.
"""
