"""The kept reports of the examples say what the program says today."""

import json
import math
from pathlib import Path
from typing import Any

import pytest

from flashplan.plan import load_plan
from flashplan.report.write import write_report

ROOT = Path(__file__).parents[2]
EXAMPLES = sorted((ROOT / "examples").glob("*.toml"))


def same(kept: Any, fresh: Any, path: str = "") -> None:
    """Equal but for the last digits, which another machine's arithmetic may turn."""
    if isinstance(kept, dict):
        assert kept.keys() == fresh.keys(), path
        for key in kept:
            same(kept[key], fresh[key], f"{path}.{key}")
    elif isinstance(kept, list):
        assert len(kept) == len(fresh), path
        for index, (one, other) in enumerate(zip(kept, fresh, strict=True)):
            same(one, other, f"{path}[{index}]")
    elif isinstance(kept, float) and isinstance(fresh, float):
        assert math.isclose(kept, fresh, rel_tol=1e-4, abs_tol=1e-12), (
            f"{path}: {kept} and {fresh}"
        )
    else:
        assert kept == fresh, path


@pytest.mark.parametrize("example", EXAMPLES, ids=lambda path: path.stem)
def test_a_kept_report_is_current(example: Path, tmp_path: Path) -> None:
    kept = ROOT / "reports" / example.stem
    write_report(load_plan(example), tmp_path)
    assert sorted(
        p.relative_to(kept) for p in kept.rglob("*") if p.is_file()
    ) == sorted(p.relative_to(tmp_path) for p in tmp_path.rglob("*") if p.is_file())
    for file in kept.glob("*.json"):
        same(
            json.loads(file.read_text()),
            json.loads((tmp_path / file.name).read_text()),
            file.name,
        )
    page = (kept / "index.html").read_text()
    assert "not a sign-off" in page
    fresh = (tmp_path / "index.html").read_text()
    answer = [line for line in page.splitlines() if 'class="answer' in line]
    assert answer == [line for line in fresh.splitlines() if 'class="answer' in line]


@pytest.mark.parametrize("example", EXAMPLES, ids=lambda path: path.stem)
def test_a_kept_page_links_to_nothing_outside(example: Path) -> None:
    page = (ROOT / "reports" / example.stem / "index.html").read_text()
    for mark in ('src="', "url(", "@import", 'href="http'):
        assert mark not in page.replace('xlink:href="#', "").replace("url(#", "")


def test_the_examples_differ_in_what_they_meet() -> None:
    met = {
        example.stem: json.loads(
            (ROOT / "reports" / example.stem / "array.json").read_text()
        )["goals_met"]
        for example in EXAMPLES
    }
    assert any(all(goals.values()) for goals in met.values())
    assert any(False in goals.values() for goals in met.values())
