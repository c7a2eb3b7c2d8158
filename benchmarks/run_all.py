"""Run every benchmark and print one table: figure | required | reached | met.

Each script in this folder prints its own lines of that form; this one collects them. Run on a quiet machine.
"""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

HERE = Path(__file__).parent
NOT_BENCHMARKS = {"run_all.py", "reference_trace.py"}


def main() -> int:
    """Run the scripts one after the other; 1 if one of them failed."""
    rows, failed = [], []
    for script in sorted(HERE.glob("*.py")):
        if script.name in NOT_BENCHMARKS:
            continue
        print(f"# {script.name}", flush=True)
        run = subprocess.run(
            [sys.executable, script, *sys.argv[1:]], capture_output=True, text=True, check=False
        )
        print(run.stdout, end="", flush=True)
        if run.returncode:
            print(run.stderr, file=sys.stderr)
            failed.append(script.name)
        rows += [
            line
            for line in run.stdout.splitlines()
            if line.count(" | ") == 3 and not line.startswith("figure")
        ]
    print("\nfigure | required | reached | met")
    print("\n".join(rows))
    if failed:
        print(f"failed: {', '.join(failed)}", file=sys.stderr)
    return 1 if failed else 0


if __name__ == "__main__":
    sys.exit(main())
