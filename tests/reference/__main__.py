"""``python -m tests.reference FILE... [--json OUT]``: run reference cases and print every expected entry."""

import argparse
import json
import sys
from pathlib import Path

from tests.reference.adapter import Result, coverage, run_case


def main(argv: list[str] | None = None) -> int:
    """Run the cases named; return 0 when every entry of every supported case is within its tolerance."""
    parser = argparse.ArgumentParser(prog="python -m tests.reference", description=__doc__)
    parser.add_argument("files", nargs="+", type=Path, metavar="FILE")
    parser.add_argument("--json", type=Path, metavar="OUT")
    args = parser.parse_args(argv)
    results = []
    for path in args.files:
        result = run_case(json.loads(path.read_text(encoding="utf-8")))
        results.append(result)
        show(result)
    summary(results)
    if args.json is not None:
        text = json.dumps({"cases": [r.as_dict() for r in results]}, indent=1)
        args.json.write_text(text + "\n", encoding="utf-8")
    return 0 if all(e.within_tol for r in results for e in r.entries) else 1


def show(result: Result) -> None:
    """Print one case."""
    if not result.supported:
        print(f"\n{result.id}: {result.reason}", flush=True)
        return
    print(f"\n{result.id}: {result.standing}, {result.seconds:.1f} s, ledger open by {result.ledger:.1e}")
    print(
        f"  {'quantity':22} {'t [s]':>10} {'value':>16} {'expected':>16} {'tolerance':>10} {'band':>10}  within  in band"
    )
    for e in result.entries:
        t = "steady" if e.t is None else f"{e.t:g}"
        marks = f"{'yes' if e.within_tol else 'NO':>6}  {'yes' if e.in_band else 'NO':>7}"
        print(f"  {e.quantity:22} {t:>10} {e.value:16.9g} {e.expected:16.9g} {e.tol:10.3g} {e.band:10.3g}  {marks}")
    sys.stdout.flush()


def summary(results: list[Result]) -> None:
    """Print the totals."""
    entries = [e for r in results for e in r.entries]
    held, count, median = coverage(results)
    print(f"\n{sum(r.supported for r in results)} cases run, {sum(not r.supported for r in results)} not supported")
    print(f"within tolerance: {sum(e.within_tol for e in entries)} of {len(entries)}")
    if count:
        print(f"transient entries inside their band: {held} of {count}; median band / true error: {median:.2f}")
    print(f"{sum(r.seconds for r in results):.1f} s in all")


if __name__ == "__main__":
    sys.exit(main())
