"""Outlines to the plan: which region lies where, and every curve between them. Exact, without a mesh."""
