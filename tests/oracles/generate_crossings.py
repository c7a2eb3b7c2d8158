"""Crossings of the equatorial plane in 50-digit arithmetic, frozen in crossings.json beside this script.

Independent of the project's kernels: Legendre's form of the orbit, u = u1 + (u2 − u1) sn²(gψ + F, m) or its cn form, with roots from
polynomial root finding and F from the incomplete integral; the delay is a quadrature of dt/dr over radius. α and β are exact
floating-point numbers. Run: python tests/oracles/generate_crossings.py (about two minutes).
"""

from __future__ import annotations

import json
import math
import random
from pathlib import Path

import mpmath as mp

mp.mp.dps = 50
OUT = Path(__file__).parent / "crossings.json"
ORDERS = 6
INCLINATIONS = [0.0, 1e-3, 0.3, 1.0, 1.55, math.pi / 2, 1.5708, 1.7, 2.6, 3.1, math.pi]


class Orbit:
    """One ray of impact parameter b: u(ψ), its ends, and its turning point."""

    def __init__(self, square: mp.mpf) -> None:
        self.b = mp.sqrt(square)
        roots = mp.polyroots([2, -1, 0, 1 / square], maxsteps=400, extraprec=400)
        real = sorted(mp.re(root) for root in roots if abs(mp.im(root)) < mp.mpf(10) ** -40)
        self.escapes = square > 27
        self.u1 = real[0]
        if self.escapes:
            self.u2, u3 = real[1], real[2]
            self.g = mp.sqrt((u3 - self.u1) / 2)
            self.m = (self.u2 - self.u1) / (u3 - self.u1)
            self.start = mp.ellipf(mp.asin(mp.sqrt(-self.u1 / (self.u2 - self.u1))), self.m)
            self.turn = (mp.ellipk(self.m) - self.start) / self.g
            self.end = 2 * self.turn
        else:
            p = (mp.mpf(1) / 2 - self.u1) / 2
            self.a = mp.sqrt(3 * self.u1**2 - self.u1)
            self.g = mp.sqrt(2 * self.a)
            self.m = mp.mpf(1) / 2 + (p - self.u1) / (2 * self.a)
            self.start = self._phase(mp.mpf(0))
            self.end = (self._phase(mp.mpf(1) / 2) - self.start) / self.g

    def _phase(self, u: mp.mpf) -> mp.mpf:
        return mp.ellipf(2 * mp.atan(mp.sqrt((u - self.u1) / self.a)), self.m)

    def u(self, psi: mp.mpf) -> mp.mpf:
        """1/r at a swept angle."""
        x = self.g * psi + self.start
        if self.escapes:
            return self.u1 + (self.u2 - self.u1) * mp.ellipfun("sn", x, m=self.m) ** 2
        cn = mp.ellipfun("cn", x, m=self.m)
        return self.u1 + self.a * (1 - cn) / (1 + cn)

    def delay(self, psi: mp.mpf) -> mp.mpf:
        """lim [t(crossing → R) − R − 2 ln(R/2)]."""
        radius = 1 / self.u(psi)
        if not self.escapes or psi <= self.turn:
            return self._inward(radius)
        return 2 * self._inward(1 / self.u2) - self._inward(radius)

    def _inward(self, radius: mp.mpf) -> mp.mpf:
        """−r − 2 ln(r/2 − 1) + ∫ [1/√W − 1]/(1 − 2/r) dr to infinity, by r = r0 + x² from the closest approach r0."""
        r0 = 1 / self.u2 if self.escapes else mp.mpf(3)

        def excess(r: mp.mpf) -> mp.mpf:
            w = 1 - self.b**2 / r**2 * (1 - 2 / r)
            return (1 / mp.sqrt(abs(w)) - 1) / (1 - 2 / r)  # rounding may take w below 0 at its zero

        def outside(x: mp.mpf) -> mp.mpf:
            return 2 * x * excess(r0 + x * x)

        start = mp.sqrt(max(radius - r0, mp.mpf(0)))
        scale = mp.sqrt(self.b) + 1
        places = [
            start,
            *(start + scale * factor for factor in (mp.mpf(1) / 1000, mp.mpf(1) / 30, 1, 30)),
            mp.inf,
        ]
        inner = mp.quad(excess, [radius, r0]) if radius < r0 and not self.escapes else mp.mpf(0)
        return -radius - 2 * mp.log(radius / 2 - 1) + inner + mp.quad(outside, places)


def swept_angle(alpha: mp.mpf, beta: mp.mpf, inclination: float) -> mp.mpf:
    """First swept angle in (0, π]: where cos ψ cos i + sin ψ (β/b) sin i vanishes."""
    if inclination == math.pi / 2:
        return mp.pi
    b = mp.hypot(alpha, beta)
    angle = mp.atan2(mp.cos(inclination), -(beta / b) * mp.sin(inclination)) % mp.pi
    return angle if angle > 0 else mp.pi


def row(alpha: float, beta: float, inclination: float) -> dict[str, object]:
    """Everything about one ray."""
    a, b = mp.mpf(alpha), mp.mpf(beta)
    square = a * a + b * b
    orbit = Orbit(square)
    found: dict[str, object] = {"alpha": alpha, "beta": beta, "inclination": inclination}
    status, radius, delay, kappa = [], [], [], []
    for order in range(ORDERS):
        psi = swept_angle(a, b, inclination) + order * mp.pi
        if psi >= orbit.end:
            status.append("ESCAPED" if orbit.escapes else "CAPTURED")
            continue
        status.append("CROSSED")
        radius.append(mp.nstr(1 / orbit.u(psi), 25))
        delay.append(mp.nstr(orbit.delay(psi), 25))
        by_angle = mp.diff(lambda x: mp.log(orbit.u(x)), psi, h=mp.mpf(10) ** -18)
        step = mp.mpf(10) ** -16 * abs(square / 27 - 1)
        near, far = (Orbit(square * (1 + side * 2 * step)).u(psi) for side in (-1, 1))
        kappa.append(float(abs(mp.log(far / near) / (2 * step)) + psi * abs(by_angle)))
    return {**found, "status": status, "radius": radius, "delay": delay, "kappa": kappa}


def rays() -> list[tuple[float, float, float]]:
    """Random screen positions: b from 1e-3 to 1e6 and within 1e-9 of the critical curve, at every inclination."""
    draw = random.Random(20)
    chosen = []
    for index in range(150):
        if index % 2:
            offset = draw.choice((-1, 1)) * 10 ** draw.uniform(-9, -0.5)
            b = math.sqrt(27.0) * (1 + offset)
        else:
            b = 10 ** draw.uniform(-3, 6) if index % 4 else 10 ** draw.uniform(0, 2)
        angle = draw.uniform(-math.pi, math.pi)
        chosen.append((b * math.cos(angle), b * math.sin(angle), INCLINATIONS[index % len(INCLINATIONS)]))
    return chosen


if __name__ == "__main__":
    OUT.write_text(json.dumps([row(*ray) for ray in rays()], indent=0) + "\n", encoding="ascii")
