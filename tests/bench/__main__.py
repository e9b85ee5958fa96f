"""Measure and print one Markdown table; exit code 0 where every bound holds, 1 where one does not."""

import os

# One thread each: these must stand before numpy is imported.
os.environ.update({"OMP_NUM_THREADS": "1", "OPENBLAS_NUM_THREADS": "1", "MKL_NUM_THREADS": "1"})

import argparse
import json
import sys
from pathlib import Path

from threadpoolctl import threadpool_limits

from tests.bench import fipy_march, growth, linear_steps, ngsolve_march, scenarios, whole_vouch
from tests.bench.rows import Row, markdown

PARTS = {
    "steps": linear_steps.rows,
    "ngsolve": ngsolve_march.rows,
    "fipy": fipy_march.rows,
    "vouch": whole_vouch.rows,
    "growth": growth.rows,
    "scenarios": scenarios.rows,
}


def main() -> int:
    parser = argparse.ArgumentParser(prog="python -m tests.bench", description=__doc__)
    parser.add_argument("parts", nargs="*", default=list(PARTS), metavar="PART", help=", ".join(PARTS))
    parser.add_argument("--json", type=Path, metavar="OUT", help="write the numbers there")
    asked = parser.parse_args()
    if strangers := set(asked.parts) - set(PARTS):
        parser.error(f"no part {', '.join(sorted(strangers))}; there are {', '.join(PARTS)}")
    rows: list[Row] = []
    with threadpool_limits(1):
        for part in asked.parts:
            print(f"measuring: {part}", file=sys.stderr, flush=True)
            rows += PARTS[part]()
    print(markdown(rows))
    if asked.json is not None:
        asked.json.write_text(json.dumps([row.as_dict() for row in rows], indent=1), encoding="utf-8")
    return 0 if all(row.holds for row in rows) else 1


if __name__ == "__main__":
    sys.exit(main())
