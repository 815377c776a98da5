"""Raw goods and fixings, by hand-worked examples (arithmetic only, no outside source needed)."""

import pytest

from planner.report.fixings import fixing_line, fixings_per_panel
from planner.report.raw_goods import IMPERIAL, HandMade, Supplies, hand_made, raw_goods

LAYERS = [
    {"layer": "perforated", "thickness_mm": 12, "hole_mm": 5},
    {"layer": "porous", "thickness_mm": 50},
    {"layer": "air", "thickness_mm": 100},
]


def line(lines, word):
    (found,) = [one for one in lines if word in one.goods]
    return found


def test_panel_of_the_board_s_size_takes_one_board():
    """Seven boards of 0.6 × 1.2 m for seven panels: two packs of six, 5 of 12 left over."""
    wool = line(raw_goods([HandMade("a", 0.6, 1.2, 7, (100.0,))]), "Porous board")
    assert wool.amount == 2
    assert wool.waste == pytest.approx(5 / 12)


def test_turned_panel_takes_no_more_than_the_upright_one():
    upright = line(raw_goods([HandMade("a", 0.6, 1.2, 6, (50.0,))]), "Porous board")
    turned = line(raw_goods([HandMade("a", 1.2, 0.6, 6, (50.0,))]), "Porous board")
    assert upright.amount == turned.amount == 1
    assert turned.waste == pytest.approx(0.0, abs=1e-9)


def test_narrow_panels_share_a_board():
    """0.3 × 0.6 m: two beside each other, two along a board: 24 panels from six boards, no waste."""
    wool = line(raw_goods([HandMade("a", 0.3, 0.6, 24, (50.0,))]), "Porous board")
    assert (wool.amount, wool.waste) == (1, pytest.approx(0.0, abs=1e-9))


def test_frame_has_two_uprights_and_rails_between_them():
    """0.6 × 0.9 m in 20 mm battens: 2 × 0.9 + 2 × 0.56 and three cuts = 2.929 m, one bar of 3 m."""
    sold = Supplies(batten_lengths=(2.4, 3.0))
    frame = line(raw_goods([HandMade("a", 0.6, 0.9, 1, (50.0,))], sold), "Frame")
    assert frame.plan.by_stock == {3.0: 1}
    assert sorted(frame.plan.bars[0].pieces) == [0.56, 0.56, 0.9, 0.9]
    assert frame.plan.bars[0].left == pytest.approx(3.0 - 2.92 - 4 * 0.003, abs=1e-6)


def test_tall_frame_has_a_middle_rail_and_a_gap_brings_spacers():
    lines = raw_goods([HandMade("a", 0.6, 1.2, 2, (50.0,), gap_mm=50.0)])
    rails = [
        p for bar in line(lines, "Frame").plan.bars for _ in range(bar.count) for p in bar.pieces
    ]
    assert rails.count(0.56) == 6
    spacers = line(lines, "Spacer").plan
    assert sum(bar.count * len(bar.pieces) for bar in spacers.bars) == 4


def test_cloth_is_laid_across_the_roll_the_shorter_way():
    """0.6 × 1.2 × 0.1 m with 60 mm folds: 0.92 × 1.52 m; on a 1.5 m roll 0.92 m a panel, turned:
    1.52 does not lie across 1.5, so one beside the other the long way: 2 × 1.52 = 3.04 m → 3.1 m.
    """
    sold = Supplies(cloth_width=1.5)
    cloth = line(raw_goods([HandMade("a", 0.6, 1.2, 2, (100.0,))], sold), "cloth")
    assert cloth.amount == pytest.approx(3.1)
    wide = line(
        raw_goods([HandMade("a", 0.6, 1.2, 2, (100.0,))], Supplies(cloth_width=1.6)), "cloth"
    )
    assert wide.amount == pytest.approx(1.9)  # 2 × 0.92 = 1.84 m
    assert not wide.notes


def test_cloth_that_the_roll_cannot_cover_says_so():
    cloth = line(raw_goods([HandMade("big", 1.6, 1.8, 1, (50.0,))]), "cloth")
    assert "needs a seam" in cloth.notes[0]


def test_sheets_hold_rows_and_columns_with_a_saw_cut_between():
    """1.22 × 2.44 m: 1.2 × 0.6 fits 1 × 4 (4 · 0.6 + 3 · 0.003 = 2.409): 9 panels are three sheets."""
    lines = raw_goods([hand_made("a", 1.2, 0.6, 9, LAYERS)])
    sheet = line(lines, "Perforated")
    assert sheet.amount == 3
    assert not [one for one in lines if "cloth" in one.goods or "Spacer" in one.goods]
    assert "× 150 mm" in line(lines, "Frame").goods  # wool 50 mm and the closed air space of 100 mm
    exact = raw_goods([hand_made("a", 1.22, 0.61, 4, LAYERS)])  # 4 × 0.61 leaves no room to saw
    assert line(exact, "Perforated").amount == 2


def test_layers_become_wool_gap_and_sheets():
    made = hand_made("a", 0.6, 1.2, 3, LAYERS)
    assert (made.wool_mm, made.gap_mm, made.depth) == ((50.0,), 100.0, 0.15)
    assert made.sheets == ("perforated sheet, 12 mm, holes 5 mm",)


def test_imperial_list_has_no_metric_words():
    texts = " ".join(
        f"{one.goods} {one.need} {one.buy}"
        for one in raw_goods([hand_made("a", 0.6, 1.2, 3, LAYERS, units="ft")], IMPERIAL)
    )
    assert " m " not in f"{texts} "
    assert "mm" not in texts.replace("holes 5 mm", "")  # drill sizes stay as ordered
    assert "m²" not in texts


@pytest.mark.parametrize(
    ("weight", "wall", "overhead", "count"),
    [
        (6.5, "masonry", False, 2),  # 6.5 · 4 / 20 = 1.3
        (12.0, "masonry", False, 3),  # 2.4
        (6.5, "plasterboard", False, 6),  # 5.2
        (6.25, "plasterboard", False, 5),  # exactly 5
        (1.0, "concrete", True, 4),
        (30.0, "timber", True, 6),
        (None, "masonry", True, 4),
        (3.0, "unknown", False, 4),
        (3.0, "straw", False, 4),  # as unknown
    ],
)
def test_fixings_by_weight_and_wall(weight, wall, overhead, count):
    """ceil(weight · 4 / rated), two at least, four overhead; rated loads common practice, no source."""
    assert fixings_per_panel(weight, wall, overhead=overhead) == count


def test_overhead_panels_get_a_second_retention_each():
    up = fixing_line("a", 5, 6.0, "timber", overhead=True)
    assert (up.each, up.retention, up.total) == (4, 5, 25)
    assert fixing_line("a", 5, 6.0, "timber", overhead=False).retention == 0
    assert "weigh" in fixing_line("a", 1, None, "timber", overhead=True).note


def test_nothing_hangs_from_a_board_alone():
    """24 kg · 4 / 20 kg in the joist; the wall's board anchor of 5 kg would be 20. Common practice."""
    up = fixing_line("a", 1, 24.0, "plasterboard", overhead=True)
    assert up.each == 5
    assert "joist" in up.kind
    assert "not into the board" in up.kind
    assert "20.0 kg" in up.note
    assert fixing_line("a", 1, 24.0, "plasterboard", overhead=False).each == 20
