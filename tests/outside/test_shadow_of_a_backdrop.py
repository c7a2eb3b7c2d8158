"""The shadow proper: a hole before a uniformly bright sky is a dark disk of radius √27.

Hilbert 1917; Darwin 1959, Proc. R. Soc. A 249, 180; √27 GM/c² stands in the abstract of Narayan, Johnson &
Gammie 2019, ApJ 885, L33.
"""

from __future__ import annotations

import numpy as np
import pytest

import emission as em
import raytrace as rt


@pytest.mark.parametrize("degrees", [0.0, 35.0, 90.0, 140.0])
def test_the_dark_disk_has_radius_root_27_at_every_angle(degrees):
    angle = np.linspace(0.1, 2.0 * np.pi, 91)
    dark, bright = (
        em.shade(
            em.Backdrop(),
            rt.trace(b * np.cos(angle), b * np.sin(angle), inclination=np.radians(degrees), orders=2),
        )
        for b in np.sqrt(27.0) * np.array([1.0 - 1e-12, 1.0 + 1e-12])
    )
    assert np.all(dark == 0.0)
    assert np.all(bright[0, 0] == 1.0)
    assert np.all(bright[0, 1] == 0.0)
