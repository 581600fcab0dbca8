"""Decoder figures show every scheme, errors or none."""

import pytest

from flashplan.decoder import compare_schemes, fault_maps
from flashplan.decoder.schemes import SCHEMES
from flashplan.report.decoder_figures import fault_map_figure, ranking_figure
from flashplan.report.drawing import as_svg
from tests.decoder.test_compare import BUBBLY, plan_of, words_of


@pytest.mark.parametrize("bubbly", [BUBBLY, []])
def test_ranking_names_every_scheme_with_its_gates(bubbly):
    table = compare_schemes(plan_of(3), words_of(3, bubbly))
    left, right = ranking_figure(table).axes
    assert {label.get_text() for label in left.get_yticklabels()} == set(SCHEMES)
    labels = [text.get_text() for text in left.texts]
    assert sorted(labels) == sorted(f"{s.gates}, {s.depth} deep" for s in table.schemes)
    assert right.get_xticks()[0] == 0


def test_fault_maps_have_a_panel_for_every_scheme():
    figure = fault_map_figure(fault_maps(4))
    titles = {axes.get_title(loc="left") for axes in figure.axes}
    assert titles >= set(SCHEMES)
    assert as_svg(figure).startswith("<?xml")
