"""Colours: contrast of every pair of text and ground, complete tokens, nothing left unfilled in the style sheet."""

import re

import pytest
from PySide6.QtGui import QColor, QPalette

from studio.theme import LEAST_CONTRAST, TEXT_PAIRS, TOKENS, Theme, contrast


def test_contrast_of_black_and_white_is_21():
    assert contrast(QColor("#000000"), QColor("#FFFFFF")) == pytest.approx(21.0, abs=1e-6)


def test_contrast_of_middle_grey_on_white():
    # #777777 on white: luminance ((0.46667 + 0.055)/1.055)^2.4 = 0.18447, contrast 1.05/0.23447
    assert contrast(QColor("#777777"), QColor("#FFFFFF")) == pytest.approx(4.478, abs=2e-3)


@pytest.mark.parametrize("name", ["light", "dark"])
@pytest.mark.parametrize("pair", TEXT_PAIRS, ids="-on-".join)
def test_text_stands_out_from_its_ground(name, pair):
    text, ground = (QColor(TOKENS[name][token]) for token in pair)
    assert contrast(text, ground) >= LEAST_CONTRAST


def test_both_themes_have_the_same_tokens():
    assert set(TOKENS["light"]) == set(TOKENS["dark"])


@pytest.mark.parametrize("name", ["light", "dark"])
def test_style_sheet_has_every_token_filled_in(qapp, name):
    sheet = Theme(name).style_sheet()
    assert "@" not in sheet
    used = set(re.findall(r"#[0-9A-Fa-f]{6}", sheet))
    assert used <= set(TOKENS[name].values())


def test_switching_tells_once_and_changes_the_palette(qapp, qtbot):
    theme = Theme("light")
    before = theme.palette().color(QPalette.ColorRole.Window)
    with qtbot.waitSignal(theme.changed):
        theme.use("dark")
    assert theme.palette().color(QPalette.ColorRole.Window) == QColor(TOKENS["dark"]["panel"]) != before
    with qtbot.assertNotEmitted(theme.changed):
        theme.use("dark")
