"""Write the kept reports of the examples anew: python -m tests.report.renew"""

from pathlib import Path

from flashplan.plan import load_plan
from flashplan.report.write import write_report

if __name__ == "__main__":
    root = Path(__file__).parents[2]
    for example in sorted((root / "examples").glob("*.toml")):
        print(
            write_report(load_plan(example), root / "reports" / example.stem).headline
        )
