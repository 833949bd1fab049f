import pytest
from PySide6.QtGui import QColor

from thalweg_app.colours import DARK, LIGHT
from thalweg_app.widgets.lattice_picture import readable_on


@pytest.mark.parametrize("palette", [LIGHT, DARK], ids=lambda p: p.name)
@pytest.mark.parametrize("fill", ["accent", "raised", "border", "muted"])
def test_numbers_of_sites_stand_out_from_their_circles(palette, fill):
    colour = QColor(getattr(palette, fill))
    assert abs(readable_on(colour, palette).lightnessF() - colour.lightnessF()) > 0.3
