"""Re-make the parts of README.md that commands print.

    python tests/readme_blocks.py columns demo measured

`columns` takes the registry, and a test compares it. `demo` runs the README's demo recipes afresh and writes what
they print; its times differ from run to run, so that no test compares it: run this after numbers have changed.
`measured` holds the results in the folder `results` (or the one that UNPAIRED_RESULTS names) against measured
couplings: run `unpaired run recipes/*.yaml` before it.
"""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
from pathlib import Path

from unpaired import columns

ROOT = Path(__file__).parent.parent
README = ROOT / "README.md"


def demo() -> str:
    """What the demo prints, as a fenced block."""
    recipes = sorted(str(path.relative_to(ROOT)) for path in (ROOT / "recipes" / "demo").glob("*.yaml"))
    with tempfile.TemporaryDirectory() as place:
        printed = subprocess.run(
            [sys.executable, "-m", "unpaired", "run", *recipes, "--out", place],
            cwd=ROOT,
            check=True,
            capture_output=True,
            text=True,
        ).stdout
    return f"```\n{printed.replace(place, 'results').rstrip()}\n```\n"


def measured() -> str:
    """Computed against measured couplings of every finished recipe."""
    results = Path(os.environ.get("UNPAIRED_RESULTS", ROOT / "results"))
    folders = sorted(str(record.parent) for record in results.glob("*/record.json"))
    return subprocess.run(
        [sys.executable, str(ROOT / "tests/benchmarks/against_measured.py"), *folders],
        check=True,
        capture_output=True,
        text=True,
    ).stdout


MAKERS = {"columns": columns.markdown, "demo": demo, "measured": measured}


def replace(text: str, name: str, content: str) -> str:
    """README text with the named block replaced."""
    begin, end = f"<!-- begin: {name} -->\n", f"<!-- end: {name} -->"
    before, rest = text.split(begin)
    return before + begin + content + end + rest.split(end)[1]


if __name__ == "__main__":
    whole = README.read_text(encoding="utf-8")
    for block in sys.argv[1:]:
        whole = replace(whole, block, MAKERS[block]())
    README.write_text(whole, encoding="utf-8")
