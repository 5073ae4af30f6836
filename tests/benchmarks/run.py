"""Runs every benchmark of this folder, one after another; each prints what it measured and the ratios.

Usage: run.py [--quick]
"""

import subprocess
import sys
from pathlib import Path

HERE = Path(__file__).parent


def main() -> int:
    """Exit code 1 if any benchmark failed."""
    failed = []
    for script in sorted(HERE.glob("bench_*.py")):
        print(f"\n=== {script.stem.removeprefix('bench_')} ===", flush=True)
        if subprocess.run([sys.executable, str(script), *sys.argv[1:]], check=False).returncode:
            failed.append(script.name)
    if failed:
        print(f"failed: {', '.join(failed)}", file=sys.stderr)
    return 1 if failed else 0


if __name__ == "__main__":
    sys.exit(main())
