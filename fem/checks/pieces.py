"""Does everything in the section touch?"""

from fem.checks.facts import Facts
from fem.results.findings import Finding
from fem.section.pieces import pieces


def check(facts: Facts) -> list[Finding]:
    """Report a section whose parts exchange no heat: meant as it is, or a gap in the drawing."""
    found = pieces(facts.study.finest.mesh.plan)
    if len(found) == 1:
        return []
    parts = " | ".join(", ".join(f'"{name}"' for name in piece) for piece in found)
    return [Finding("pieces", f"the section is in {len(found)} pieces that exchange no heat with each other: {parts}")]
