"""Files that ship with the window: icons of one stroke, a font with figures of equal width and its licence."""

import re

import pytest
from PySide6.QtGui import QColor, QFontMetricsF, QImage

from studio import resources
from studio.views.strip import SEGMENT_KINDS, VESSEL_KINDS

OF_STYLE = {"arrow-light", "arrow-dark", "check-light", "check-dark"}
"""Pictures of the style sheet, which cannot recolour."""
OF_PROGRAM = sorted({path.stem for path in resources.ICONS.glob("*.svg")} - OF_STYLE)


@pytest.mark.parametrize("name", OF_PROGRAM)
def test_icon_has_one_stroke_width_and_takes_the_ink(name):
    source = resources.icon_source(name)
    assert re.findall(r'stroke-width="([^"]+)"', source) == ["1.4"]
    assert 'stroke="currentColor"' in source
    assert not re.search(r"#[0-9a-fA-F]{3,6}", source)


@pytest.mark.parametrize("kind", SEGMENT_KINDS + VESSEL_KINDS)
def test_every_kind_has_an_icon_that_is_drawn_in_the_colour(qapp, kind):
    image = resources.icon_pixmap(kind, QColor("#ff0000"), 40).toImage().convertToFormat(QImage.Format.Format_ARGB32)
    solid = [
        image.pixelColor(x, y)
        for x in range(image.width())
        for y in range(image.height())
        if image.pixelColor(x, y).alpha() == 255
    ]
    assert len(solid) > 30
    assert all(colour.red() == 255 and colour.green() == 0 for colour in solid)


def test_icons_differ_from_each_other():
    sources = [resources.icon_source(name) for name in OF_PROGRAM]
    assert len(set(sources)) == len(sources)


def test_font_ships_with_its_licence_and_has_figures_of_equal_width(qapp):
    families = resources.load_fonts()
    assert families
    assert "SIL OPEN FONT LICENSE" in (resources.FONTS / "OFL.txt").read_text(encoding="utf-8").upper()
    metrics = QFontMetricsF(resources.window_font(families))
    widths = {metrics.horizontalAdvance(10 * figure) for figure in "0123456789"}
    assert max(widths) - min(widths) < 0.01
