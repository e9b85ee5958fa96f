"""Check cases from outside the project: published standards, handbooks, exact solutions. Run with ``python -m tests.reference``."""
