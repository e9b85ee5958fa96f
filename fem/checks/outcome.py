"""Did every run reach its end?"""

from fem.checks.facts import Facts
from fem.results.findings import Finding
from fem.solve.march import Outcome


def check(facts: Facts) -> list[Finding]:
    """Report a run that did not finish, with how far it came."""
    found = []
    for run in facts.study.runs:
        if run.outcome in (
            Outcome.finished,
            Outcome.stopped,
        ):  # a stop is told as what it was: the user's or the allowance's
            continue
        reached = facts.names.time(float(run.history.t1[-1])) if len(run.history.t1) else "the first step"
        found.append(
            Finding(
                "outcome",
                f"a run on {len(run.mesh.cells)} cells did not finish: {run.outcome.value}; it reached {reached}",
                "look at what the data do at that time; a table that jumps or a property near zero is the usual cause",
                blocks=True,
            )
        )
    return found
