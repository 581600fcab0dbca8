"""What people see of a study's way."""

import io
import time

import pytest
from rich.console import Console

from flashplan.study.progress import BarProgress, NoProgress, console_progress
from flashplan.study.run import run_study
from tests.study.tasks import draw


class Recorder:
    """Writes down what it is told."""

    def __init__(self) -> None:
        self.told: list[object] = []

    def begin(self, total: int, finished: int) -> None:
        self.told.append((total, finished))

    def advance(self) -> None:
        self.told.append("advance")

    def end(self) -> None:
        self.told.append("end")


def test_a_study_tells_its_way(tmp_path) -> None:
    recorder = Recorder()
    run_study(draw, 3, seed=1, store=tmp_path / "store", progress=recorder)
    assert recorder.told == [(3, 0), "advance", "advance", "advance", "end"]
    again = Recorder()
    run_study(draw, 3, seed=1, store=tmp_path / "store", progress=again)
    assert again.told == [(3, 3), "end"]


def test_a_study_that_breaks_off_ends_its_progress() -> None:
    recorder = Recorder()
    with pytest.raises(ZeroDivisionError):
        run_study(lambda index, generator: 1 / 0, 3, seed=1, progress=recorder)
    assert recorder.told == [(3, 0), "end"]


def _shown(patience: float, pause: float) -> str:
    text = io.StringIO()
    bar = BarProgress(Console(file=text, force_terminal=True, width=80), patience)
    bar.begin(10, 4)
    time.sleep(pause)
    bar.advance()
    bar.end()
    return text.getvalue()


def test_a_short_study_shows_no_bar() -> None:
    assert _shown(patience=60.0, pause=0.0) == ""


def test_a_long_study_shows_what_is_done_of_how_much() -> None:
    shown = _shown(patience=0.0, pause=0.3)
    assert "4/10" in shown
    assert "-:--:--" in shown  # the time left, before there is anything to tell it from


def test_one_bar_serves_several_studies() -> None:
    text = io.StringIO()
    bar = BarProgress(Console(file=text, force_terminal=True, width=80), 60.0)
    assert len(run_study(draw, 3, seed=1, progress=bar)) == 3
    assert len(run_study(draw, 2, seed=1, progress=bar)) == 2


def test_no_bar_is_shown_where_nobody_looks() -> None:
    with console_progress() as progress:  # tests have no terminal
        assert isinstance(progress, NoProgress)
        assert len(run_study(draw, 3, seed=1, progress=progress)) == 3
