"""Images of equatorial circles: radii, widths and boundaries of the direct image and the rings that follow it.

Tags as in test_light_bending.py: CHK computed independently in arbitrary precision, ABS read, MEM from memory.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

import raytrace as rt

# Face-on image radii b_n(r), CHK, exact to the digits shown.
FACE_ON = {
    2.0: (2.84769633, 5.01513549, 5.18780817, 5.19579029),
    2.5: (3.36856703, 5.11118959, 5.19250140, 5.19599461),
    3.0: (3.88426557, 5.18991324, 5.19614030, 5.19615240),
    4.0: (4.90641643, 5.31287269, 5.20146407, 5.19638222),
    5.0: (5.92135946, 5.40569185, 5.20520323, 5.19654289),
    6.0: (6.93214848, 5.47891372, 5.20798959, 5.19666221),
    8.0: (8.94671704, 5.58804889, 5.21188501, 5.19682842),
    10.0: (10.95611505, 5.66615034, 5.21449020, 5.19693917),
    20.0: (20.97665114, 5.86541084, 5.22048444, 5.19719275),
    50.0: (50.99027770, 6.02849208, 5.22473816, 5.19737158),
}
# b at the far side, the side and the near side, CHK; for n = 1 at the same screen angles.
INCLINED = {
    (6.0, 30.0, 0): (7.348112, 6.932148, 5.478011),
    (6.0, 30.0, 1): (5.362172, 5.478914, 5.676458),
    (6.0, 80.0, 0): (6.669365, 6.932148, 1.043217),
    (6.0, 80.0, 1): (5.264696, 5.478914, 6.304566),
    (20.0, 80.0, 0): (11.892317, 20.976651, 3.474292),
    (20.0, 80.0, 1): (5.341494, 5.865411, 9.331127),
}
CRITICAL = math.sqrt(27.0)


def image(radius, order, angle=0.3, inclination=0.0):
    return float(rt.isoradial(radius, order=order, angle=angle, inclination=inclination))


@pytest.mark.parametrize("radius", FACE_ON)
def test_face_on_image_radii(radius):
    for order, b in enumerate(FACE_ON[radius]):
        assert image(radius, order) == pytest.approx(b, abs=6e-9)


@pytest.mark.parametrize(("case", "expected"), INCLINED.items())
def test_inclined_image_radii(case, expected):
    radius, degrees, order = case
    for angle, b in zip((math.pi / 2, 0.0, -math.pi / 2), expected, strict=True):
        assert image(radius, order, angle, math.radians(degrees)) == pytest.approx(b, abs=6e-7)


def test_slope_of_the_image_radius_at_six():
    # db/dr at r = 6, n = 0, 1, 2: CHK.
    for order, slope in enumerate((1.0092948, 0.06563866, 0.002434655)):
        step = 1e-4
        found = (image(6.0 + step, order) - image(6.0 - step, order)) / (2.0 * step)
        assert found == pytest.approx(slope, rel=1e-6)


def test_the_inner_shadow_of_a_disk_seen_face_on():
    # Direct image of the horizon's rim: b ≈ 2.848 (Chael, Johnson & Lupsasca 2021, ApJ 918, 6: abstract read, number not); CHK
    # 2.847696331. √8 = 2.828 is Beloborodov's approximation, not this.
    assert image(2.0, 0) == pytest.approx(2.847696331, abs=1e-9)


def test_the_direct_image_adds_about_one():
    # "Just add one": b ≈ r + 1 (Gralla & Lupsasca 2020, MEM-M); CHK b − r = 0.848, 0.884, 0.932, 0.956, 0.977.
    for radius, added in {2.0: 0.848, 3.0: 0.884, 6.0: 0.932, 10.0: 0.956, 20.0: 0.977}.items():
        assert image(radius, 0) - radius == pytest.approx(added, abs=6e-4)


def test_boundaries_of_lensed_and_photon_rings():
    # Gralla, Holz & Wald 2019, PRD 100, 024018, section II: 5.02–5.19 and 5.23–6.17 (MEM-H); CHK by total swept angle.
    inner = [image(2.0, order) for order in (1, 2, 3)]
    assert inner == pytest.approx([5.015135494198, 5.187808174876, 5.195790293], abs=1e-9)
    outer = [image(1e9, order) for order in (1, 2, 3)]
    assert outer == pytest.approx([6.167566764768, 5.227938608534, 5.197505487], abs=1e-7)
    # "The lensed ring is about 5 % larger than the photon ring" (abstract, ABS); r = 6: 5.4789/5.1962 = 1.054.
    assert image(6.0, 1) / CRITICAL == pytest.approx(1.054, abs=6e-4)


def test_bands_shrink_by_e_to_the_pi_only_in_the_limit():
    # Widths of the bands of a full disk face-on: CHK 1.152431, 0.0401304, 0.00171519; ratios 28.717, 23.397 → e^π = 23.1407.
    widths = [image(1e9, order) - image(2.0, order) for order in (1, 2, 3)]
    assert widths == pytest.approx([1.152431, 0.0401304, 0.00171519], rel=3e-6)
    assert widths[0] / widths[1] == pytest.approx(28.717, abs=1e-3)
    assert widths[1] / widths[2] == pytest.approx(23.397, abs=2e-3)
    deeper = [image(1e9, order) - image(2.0, order) for order in (3, 4)]
    assert deeper[0] / deeper[1] == pytest.approx(math.exp(math.pi), rel=2e-3)


@pytest.mark.parametrize(
    ("radius", "order", "error"), [(6.0, 1, 1.8e-3), (6.0, 2, 8e-6), (1e9, 1, 4e-2), (1e9, 2, 1e-4)]
)
def test_strong_deflection_ring_radii_to_their_stated_error(radius, order, error):
    # b_n = √27 [1 + F e^−(n+½)π], F = 216 (2 − √3)(√3 − s)/(√3 + s), s = √(1 + 6/r): Bozza & Scarpetta 2007; Bisnovatyi-Kogan &
    # Tsupko 2022, PRD 105, 064040 (abstract read; form re-derived, CHK). Good for n ≥ 2, never for n = 1.
    s = math.sqrt(1.0 + 6.0 / radius)
    root = math.sqrt(3.0)
    f = 216.0 * (2.0 - root) * (root - s) / (root + s)
    approximate = CRITICAL * (1.0 + f * math.exp(-(order + 0.5) * math.pi))
    found = abs(approximate / image(radius, order) - 1.0)
    assert 0.4 * error < found < 1.3 * error


def test_delays_between_orders():
    # Face-on, r = 6: T1 − T0 = 20.3361, T2 − T1 = 16.5914, T3 − T2 = 16.3355 (CHK) → 3√3 π = 16.32419428.
    delays = []
    for order in range(5):
        b = image(6.0, order)
        hit = rt.trace(b * math.cos(0.3), b * math.sin(0.3), inclination=0.0, orders=order + 1)
        delays.append(hit.delay[order])
    assert np.diff(delays)[:3] == pytest.approx([20.3361, 16.5914, 16.3355], abs=6e-5)
    assert np.diff(delays)[3] == pytest.approx(3.0 * math.sqrt(3.0) * math.pi, rel=1e-4)


def test_gap_between_rings():
    # Δ_n = (b_n − b_{n+1})/b_{n+1} for r = 6, n = 2: 2.1797e-3 (Aratore, Tsupko & Perlick 2024, abstract read; CHK).
    assert image(6.0, 2) / image(6.0, 3) - 1.0 == pytest.approx(2.1797e-3, rel=3e-5)


def test_the_critical_curve_is_a_circle_of_root_27():
    # Hilbert 1917; diameter 2√(area/π) = 2√27 at every inclination.
    angle = np.linspace(0.0, 2.0 * math.pi, 181)
    for inclination in (0.0, 0.7, math.pi / 2):
        radius = rt.critical_curve(inclination=inclination, angle=angle)
        area = 0.5 * np.trapezoid(radius**2, angle)
        assert 2.0 * math.sqrt(area / math.pi) == pytest.approx(2.0 * 5.196152422706632, rel=1e-14)
    with pytest.raises(ValueError, match="outside 0 to π"):
        rt.critical_curve(inclination=-0.1, angle=0.0)


def test_small_bending_is_as_beloborodovs_formula_says_to_its_stated_error():
    # 1 − cos α = (1 − cos ψ)(1 − 2/r), Beloborodov 2002, ApJ 566, L85 (MEM-H); at r = 6 and α = 60° its bending errs by 0.3 % (CHK).
    r, alpha = 6.0, math.radians(60.0)
    b = r * math.sin(alpha) / math.sqrt(1.0 - 2.0 / r)
    psi_formula = math.acos(1.0 - (1.0 - math.cos(alpha)) / (1.0 - 2.0 / r))
    # A ray straight up or down the screen sweeps ψ₀ = π/2 − i below the origin: find the i at which it lands on r.
    low, high = 0.0, math.pi / 2 - 1e-6
    for _ in range(60):
        middle = 0.5 * (low + high)
        hit = rt.trace(0.0, -b, inclination=middle, orders=1)
        low, high = (low, middle) if hit.status[0] == 0 and hit.radius[0] > r else (middle, high)
    psi = math.pi / 2 - 0.5 * (low + high)
    bending, approximate = psi - alpha, psi_formula - alpha
    assert abs(approximate / bending - 1.0) == pytest.approx(0.003, abs=0.0015)
