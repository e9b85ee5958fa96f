"""What a judgement shows, in one sentence for the user."""

import numpy as np

from fem.checks.facts import Namer
from fem.earn.judge import Judgement, too_wide


def found_text(judgement: Judgement, names: Namer) -> str:
    """Return what was found: the worst band, the limits, the findings that block."""
    if not np.isfinite(judgement.figures.band).any():
        return "one run alone has no band"
    parts = []
    if judgement.needs:
        worst = judgement.needs[0]
        at = names.time(worst.t)
        owed = "time steps" if worst.time > worst.space else "cells"
        if worst.total > 1.0:
            parts.append(
                f"widest: {too_wide(worst.goal.key)} at {at}, {worst.total:.2g} times the band asked for, mostly owed by {owed}"
            )
        else:
            parts.append(f"every band is within what was asked at the reporting times (widest {worst.total:.2g} of it)")
    if judgement.too_close:
        parts.append("too close to call: " + ", ".join(f'"{name}"' for name in judgement.too_close))
    blocking = sum(f.blocks for f in judgement.findings)
    if blocking:
        parts.append(f"{blocking} finding{'s' if blocking > 1 else ''} to close")
    return "; ".join(parts) if parts else "nothing was asked for"
