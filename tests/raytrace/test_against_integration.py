"""Two oracles that share no closed form with the project: geodesics by integration, and light in an optical medium.

The first integrates Hamilton's equations of the metric in (r, θ, φ) with SciPy's DOP853. The second uses that the spatial path of
light is that in a medium of index n(ρ) = (1 + 1/(2ρ))³/(1 − 1/(2ρ)), ρ the isotropic radius (a fact of the trade).
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.integrate import solve_ivp

import raytrace as rt

# Where integration starts: a ray sweeps asin(b/FAR) until there but for b³/(4 FAR⁴), which is below rounding.
FAR = 2e4
RAYS = [
    (3.0, 5.0, 0.6),
    (-6.0, 2.0, 1.1),
    (5.1, 1.5, 0.3),
    (2.0, -8.0, 1.3),
    (-4.9, 1.9, 2.2),
    (9.0, 3.0, 0.9),
    (20.0, -12.0, 0.2),
    (-5.3, 0.4, 1.5),
    (4.0, 3.4, 2.8),
    (0.5, 6.0, 1.2),
    (5.0, -1.45, 0.8),
    (4.0, 6.0, math.pi / 2),
    (4.0, -6.0, math.pi / 2),
]
# DOP853 at a relative 1e-12 reaches 1e-10 at the third crossing.
INTEGRATED = 1e-9
# Of a time of 2e4 M, known to that; what is left out of its start is of the order of b⁴/FAR³.
DELAY_INTEGRATED = 2e-8


def start(alpha, beta, inclination):
    """Position and covariant momentum (p_r, p_θ, p_φ) of the photon where it passes r = FAR on its way to the observer."""
    normal = np.array([math.sin(inclination), 0.0, math.cos(inclination)])
    right = np.array([0.0, 1.0, 0.0])
    up = np.array([-math.cos(inclination), 0.0, math.sin(inclination)])
    b = math.hypot(alpha, beta)
    # Swept by asin(b/FAR) from the observer's direction.
    place = math.sqrt(FAR**2 - b**2) * normal + alpha * right + beta * up
    theta, phi = math.acos(place[2] / FAR), math.atan2(place[1], place[0])
    e_theta = np.array([math.cos(theta) * math.cos(phi), math.cos(theta) * math.sin(phi), -math.sin(theta)])
    p_theta = FAR * float(normal @ e_theta)
    p_phi = -alpha * math.sin(inclination)
    p_theta = math.copysign(math.sqrt(max(b**2 - (p_phi / math.sin(theta)) ** 2, 0.0)), p_theta)
    f = 1.0 - 2.0 / FAR
    p_r = math.sqrt(1.0 / f - b**2 / FAR**2) / math.sqrt(f)
    return theta, phi, p_r, p_theta, p_phi


def backward(_, state, p_phi):
    r, theta, _phi, _time, p_r, p_theta = state
    f = 1.0 - 2.0 / r
    sine, cosine = math.sin(theta), math.cos(theta)
    force = 1.0 / (r**2 * f**2) + p_r**2 / r**2 - (p_theta**2 + (p_phi / sine) ** 2) / r**3
    return [
        -f * p_r,
        -p_theta / r**2,
        -p_phi / (r * sine) ** 2,
        1.0 / f,
        force,
        -(p_phi**2) * cosine / (r**2 * sine**3),
    ]


def crossings(alpha, beta, inclination):
    """Radius, azimuth, time before FAR, p_r and p_θ at each crossing of the plane."""
    theta, phi, p_r, p_theta, p_phi = start(alpha, beta, inclination)

    def plane(_, state, *__):
        return state[1] - 0.5 * math.pi

    def horizon(_, state, *__):
        return state[0] - 2.01

    def away(_, state, *__):
        return state[0] - 1.1 * FAR

    horizon.terminal = away.terminal = True
    run = solve_ivp(
        backward,
        (0.0, 5.0 * FAR),
        [FAR, theta, phi, 0.0, p_r, p_theta],
        method="DOP853",
        rtol=1e-12,
        atol=1e-12,
        events=(plane, horizon, away),
        args=(p_phi,),
    )
    return run.y_events[0]


@pytest.mark.parametrize("ray", RAYS)
def test_crossings_agree_with_integration_of_the_geodesics(ray):
    found = crossings(*ray)
    hit = rt.trace(ray[0], ray[1], inclination=ray[2], orders=3)
    inside = [order for order in range(3) if hit.status[order] == rt.RayStatus.CROSSED]
    assert inside
    assert len(found) == len(inside)
    for order in inside:
        r, _theta, phi, time, p_r, p_theta = found[order]
        assert hit.radius[order] == pytest.approx(r, rel=INTEGRATED)
        turned = math.remainder(hit.azimuth[order] - phi, 2.0 * math.pi)
        assert turned == pytest.approx(0.0, abs=INTEGRATED)
        assert hit.momentum[0, order] == pytest.approx(p_r, rel=INTEGRATED, abs=INTEGRATED)
        assert hit.momentum[1, order] == pytest.approx(p_theta, rel=INTEGRATED)
        # From FAR on: the tortoise time and, for the slant of the path, b²/(2 FAR).
        b_square = ray[0] ** 2 + ray[1] ** 2
        delay = time - FAR - 2.0 * math.log(FAR / 2.0 - 1.0) + b_square / (2.0 * FAR)
        assert hit.delay[order] == pytest.approx(delay, abs=DELAY_INTEGRATED)


@pytest.mark.parametrize(("b", "angle"), [(6.5, 2.2), (5.3, 2.9), (4.0, 1.7), (30.0, 2.5)])
def test_light_takes_the_path_of_an_optical_medium(b, angle):
    """The eikonal equation d/ds(n dx/ds) = ∇n in isotropic radius, traced backward in a plane to a swept angle."""

    def index(rho):
        return (1.0 + 0.5 / rho) ** 3 / (1.0 - 0.5 / rho)

    def slope(rho):
        return index(rho) * (-1.5 / (rho**2 * (1.0 + 0.5 / rho)) - 0.5 / (rho**2 * (1.0 - 0.5 / rho)))

    def medium(_, state):
        x, y, u, v = state
        rho = math.hypot(x, y)
        n = index(rho)
        return [u / n, v / n, slope(rho) * x / rho, slope(rho) * y / rho]

    def line(_, state):
        return math.atan2(state[1], state[0]) - angle

    line.terminal = True
    # Swept by asin(b/r) until there, as above; n ρ sin δ = b is conserved, δ the angle from the radius.
    swept = math.asin(b / (FAR * (1.0 + 0.5 / FAR) ** 2))
    heading = swept - math.asin(b / (index(FAR) * FAR))
    run = solve_ivp(
        medium,
        (0.0, 3.0 * FAR),
        [
            FAR * math.cos(swept),
            FAR * math.sin(swept),
            -index(FAR) * math.cos(heading),
            -index(FAR) * math.sin(heading),
        ],
        method="DOP853",
        rtol=1e-12,
        atol=1e-12,
        events=line,
    )
    rho = math.hypot(*run.y_events[0][0][:2])
    radius = rho * (1.0 + 0.5 / rho) ** 2
    # A ray straight up the screen sweeps ψ₀ = π/2 + (π/2 − i') with tan i' = cot i: choose i so that ψ₀ is the angle.
    inclination = angle - 0.5 * math.pi
    hit = rt.trace(0.0, b, inclination=inclination, orders=1)
    assert hit.radius[0] == pytest.approx(radius, rel=INTEGRATED)
