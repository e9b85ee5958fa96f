"""What the solver costs, measured beside what it is held against. `python -m tests.bench`; no part of the timed tests."""
