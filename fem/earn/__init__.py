"""From studies to numbers with bands, verdicts and a standing, and what to refine next."""
