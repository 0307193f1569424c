"""Speed, measured beside compiled kernels of the same arithmetic; run by hand: ``python -m tests.speed``."""
