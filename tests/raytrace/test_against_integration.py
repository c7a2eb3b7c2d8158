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

FAR = 2e4  # where integration starts; bending beyond it is below 4/FAR
RAYS = [
    (3.0, 5.0, 0.6),
    (-6.0, 2.0, 1.1),
    (5.1, 1.5, 0.3),
    (2.0, -8.0, 1.3),
    (-4.9, 1.9, 2.2),
    (9.0, 3.0, 0.9),
]


def start(alpha, beta, inclination):
    """Position and covariant momentum (p_r, p_θ, p_φ) of the photon where it passes r = FAR on its way to the observer."""
    normal = np.array([math.sin(inclination), 0.0, math.cos(inclination)])
    right = np.array([0.0, 1.0, 0.0])
    up = np.array([-math.cos(inclination), 0.0, math.sin(inclination)])
    b = math.hypot(alpha, beta)
    # Flat space up to bending: aim at the screen plane and put it on the sphere of radius FAR.
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
    hit = rt.trace(ray[0], ray[1], inclination=ray[2], orders=2)
    inside = [
        order for order in range(2) if hit.status[order] == rt.RayStatus.CROSSED and hit.radius[order] < 1e3
    ]
    assert inside
    for order in inside:
        r, _theta, phi, time, p_r, p_theta = found[order]
        # Bending beyond FAR moves a ray by about its b/FAR: the tolerance is that, times how much orbits amplify it.
        loose = 2e-3 * (1.0 if order == 0 else 30.0)
        assert hit.radius[order] == pytest.approx(r, rel=loose)
        assert math.cos(hit.azimuth[order] - phi) == pytest.approx(1.0, abs=loose)
        assert hit.momentum[0, order] == pytest.approx(p_r, rel=loose, abs=loose)
        assert hit.momentum[1, order] == pytest.approx(p_theta, rel=loose)
        delay = time - (FAR - 2.0 * 0.0) - 2.0 * math.log(FAR / 2.0)
        assert hit.delay[order] == pytest.approx(delay, rel=loose, abs=0.05)


def test_light_takes_the_path_of_an_optical_medium():
    """The eikonal equation d/ds(n dx/ds) = ∇n in isotropic radius, traced backward in a plane until ψ = 2.2 rad."""

    def index(rho):
        return (1.0 + 0.5 / rho) ** 3 / (1.0 - 0.5 / rho)

    def slope(rho):
        return index(rho) * (-1.5 / (rho**2 * (1.0 + 0.5 / rho)) - 0.5 / (rho**2 * (1.0 - 0.5 / rho)))

    def medium(_, state):
        x, y, u, v = state
        rho = math.hypot(x, y)
        n = index(rho)
        return [u / n, v / n, slope(rho) * x / rho, slope(rho) * y / rho]

    b, angle, far = 6.5, 2.2, 2e4

    def line(_, state):
        return math.atan2(state[1], state[0]) - angle

    line.terminal = True
    n = index(math.hypot(far, b))
    run = solve_ivp(
        medium, (0.0, 3 * far), [far, b, -n, 0.0], method="DOP853", rtol=1e-12, atol=1e-12, events=line
    )
    rho = math.hypot(*run.y_events[0][0][:2])
    radius = rho * (1.0 + 0.5 / rho) ** 2
    # A ray straight up the screen sweeps ψ₀ = π/2 + (π/2 − i') with tan i' = cot i: choose i so that ψ₀ is the angle.
    inclination = angle - 0.5 * math.pi
    hit = rt.trace(0.0, b, inclination=inclination, orders=1)
    # The medium starts at a finite distance: its b is defined there to 1/far.
    assert hit.radius[0] == pytest.approx(radius, rel=5e-4)
