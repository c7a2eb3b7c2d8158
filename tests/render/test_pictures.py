"""The picture of an image shows the whole field, and its bright part again where that is small.

Common practice, no source.
"""

from __future__ import annotations

import struct

import pytest

import ringwright as rw
from ringwright.figures.image import draw_image


def size(path) -> tuple[int, int]:
    """Width and height of a PNG, from its header (PNG specification, section 11.2.2)."""
    width, height = struct.unpack(">II", path.read_bytes()[16:24])
    return width, height


@pytest.mark.parametrize(("field", "panels"), [("160 M", 2), ("24 M", 1)])
def test_a_small_ring_in_a_wide_field_is_drawn_again_larger(write_scene, tmp_path, field, panels):
    image = rw.render(rw.load_scene(write_scene(field=field)))
    width, height = size(draw_image(image, tmp_path / "picture.png"))
    assert (2 if width > 1.5 * height else 1) == panels
