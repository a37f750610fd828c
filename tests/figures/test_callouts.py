"""Labels beside points: near, clear of what is taken, and off the lines where there is a choice."""

from __future__ import annotations

from matplotlib.axes import Axes
from matplotlib.figure import Figure
from numpy import array

from porkgrid.figures.callouts import Drawing, draw_callout
from porkgrid.figures.placement import Box, Room
from porkgrid.figures.style import new_slide

REGION = Box(1.0, 1.0, 5.0, 4.0)


def fresh() -> tuple[Figure, Axes, Drawing]:
    figure, sheet = new_slide()
    return figure, sheet, Drawing(Room(REGION))


def gap(box: Box, x: float, y: float) -> float:
    """Distance from a point to a box."""
    across = max(box.left - x, 0.0, x - box.right)
    up = max(box.bottom - y, 0.0, y - box.top)
    return float((across**2 + up**2) ** 0.5)


def test_a_label_with_room_stands_beside_its_point_without_a_leader() -> None:
    _, sheet, drawing = fresh()
    assert draw_callout(sheet, drawing, [(3.0, 2.5)], ["Venus", "2034-12-10"], 8.0)
    assert 0.0 < gap(drawing.room.taken[-1], 3.0, 2.5) < 0.16
    assert len(sheet.lines) == 0
    assert [text.get_text() for text in sheet.texts] == ["Venus", "2034-12-10"]


def test_labels_of_one_point_keep_clear_of_each_other_and_of_the_edge() -> None:
    _, sheet, drawing = fresh()
    for n in range(12):
        assert draw_callout(sheet, drawing, [(4.9, 3.9)], [f"label {n}"], 8.0)
    boxes = drawing.room.taken
    assert not any(a.meets(b) for i, a in enumerate(boxes) for b in boxes[:i])
    assert all(REGION.holds(box) for box in boxes)
    assert len(sheet.lines) > 0  # those that stand off have leaders


def test_a_label_hides_no_line_where_there_is_free_ground() -> None:
    _, sheet, drawing = fresh()
    drawing.add_line(array([(1.0, 2.5), (5.0, 2.5)]))
    drawing.add_line(array([(3.0, 2.5), (3.0, 4.0)]))
    assert draw_callout(sheet, drawing, [(3.0, 2.5)], ["below"], 8.0)
    assert drawing.hidden(drawing.room.taken[-1]) == 0


def test_of_several_anchors_the_freest_is_taken() -> None:
    _, sheet, drawing = fresh()
    drawing.room.taken.append(Box(1.5, 1.5, 3.5, 3.5))
    assert draw_callout(sheet, drawing, [(2.5, 2.5), (4.4, 2.5)], ["free"], 8.0)
    assert gap(drawing.room.taken[-1], 4.4, 2.5) < 0.16


def test_without_a_place_within_reach_nothing_is_drawn() -> None:
    _, sheet, drawing = fresh()
    drawing.room.taken.append(Box(2.0, 1.5, 4.0, 3.5))
    assert not draw_callout(sheet, drawing, [(3.0, 2.5)], ["none"], 8.0, reach_in=0.5)
    assert len(sheet.texts) == 0
    assert draw_callout(sheet, drawing, [(3.0, 2.5)], ["far"], 8.0)
