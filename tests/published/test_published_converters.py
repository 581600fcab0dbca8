"""Figures of merit of published converters, recomputed from the survey's own figures."""

import pytest

from flashplan.report.published import published_converters, walden_figure


def test_every_row_reproduces_the_surveys_figure_of_merit() -> None:
    # B. Murmann, "ADC Performance Survey 1997-2025": Walden figure of merit P / (2^ENOB f_s) of each row.
    rows = published_converters()
    assert len(rows) > 50
    for row in rows:
        assert walden_figure(row.power, row.rate, row.sndr_db) == pytest.approx(
            row.walden_fom, rel=1e-3
        ), row.paper


def test_a_known_row() -> None:
    # ISSCC 2001, paper 8.1: 0.545 W, 1.3 GS/s, 35 dB: 9126.148 fJ per conversion step.
    row = next(
        r
        for r in published_converters()
        if (r.year, r.venue, r.paper) == (2001, "ISSCC", "8.1")
    )
    assert walden_figure(row.power, row.rate, row.sndr_db) == pytest.approx(
        9126.148e-15, rel=1e-4
    )
    assert row.energy == pytest.approx(0.545 / 1.3e9)
