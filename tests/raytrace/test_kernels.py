"""What the compiled kernels promise whatever they are run on: a ray alone or in a crowd, compiled or not, in this process or a benchmark's.

The kernels of radii alone take many rays at a time; those of everything take one. No outside source is needed for any of this.
"""

from __future__ import annotations

import json
import math
import subprocess
import sys

import numpy as np
import pytest

import raytrace as rt

ALONE = {"azimuth": False, "delay": False, "momentum": False}
# More than a tile of 4096 rays and no multiple of four, so that every vector loop has its remainder.
RAYS = 4099
RANDOM = np.random.default_rng(11)
BETWEEN = np.concatenate(
    [
        RANDOM.uniform(-12.0, 12.0, RAYS - 300),
        math.sqrt(27.0) * (1.0 + RANDOM.choice([-1, 1], 200) * 10.0 ** RANDOM.uniform(-9, -3, 200)),
        10.0 ** RANDOM.uniform(-3, 6, 100),
    ]
)
TURN = RANDOM.uniform(-math.pi, math.pi, RAYS)
ALPHA, BETA = BETWEEN * np.cos(TURN), BETWEEN * np.sin(TURN)
# Of 1/r: two closed forms of different rounding; 1/r depends on b more steeply, the nearer the critical curve.
ROUNDING = 1e-14

TINY = """
import json, sys
import raytrace as rt
alpha, beta = [0.0, 3.0, 5.19, 5.2, 9.0, 40.0, 0.2, 0.0], [-4.0, 4.25, 0.1, 0.01, -3.0, 2.0, 0.1, 0.0]
found = []
for inclination in (0.0, 0.7, 2.5):
    everything = rt.trace(alpha, beta, inclination=inclination, orders=3)
    alone = rt.trace(alpha, beta, inclination=inclination, orders=3, azimuth=False, delay=False, momentum=False)
    for part in (everything.radius, everything.azimuth, everything.delay, everything.momentum, alone.radius):
        found += part.ravel().tolist()
    found += everything.status.ravel().tolist() + alone.status.ravel().tolist()
found += [float(rt.deflection(b)) for b in (5.2, 9.0, 1e4)]
found += [float(rt.light_time(*path)) for path in ((7.0, 90.0, 6.0, 1), (7.0, 90.0, 6.0, 0), (2.5, 9.0, 3.0), (2.1, 2.3, 6.0))]
print(json.dumps(found))
"""


@pytest.mark.parametrize("inclination", [0.0, 0.7, 1.5, math.pi / 2, 2.5, math.pi])
def test_both_kernels_find_the_same_crossings(inclination):
    everything = rt.trace(ALPHA, BETA, inclination=inclination, orders=4)
    alone = rt.trace(ALPHA, BETA, inclination=inclination, orders=4, **ALONE)
    np.testing.assert_array_equal(alone.status, everything.status)
    np.testing.assert_array_equal(alone.fate, everything.fate)
    steepness = 1.0 / np.abs(np.hypot(ALPHA, BETA) / math.sqrt(27.0) - 1.0)
    difference = np.abs(1.0 / alone.radius - 1.0 / everything.radius) / (1.0 + steepness)
    assert np.nanmax(difference) < ROUNDING


@pytest.mark.parametrize("asked", [{}, ALONE], ids=["everything", "radius alone"])
def test_a_ray_does_not_depend_on_its_neighbours(asked):
    together = rt.trace(ALPHA, BETA, inclination=0.7, orders=4, **asked).radius
    apart = [
        rt.trace(x, y, inclination=0.7, orders=4, **asked).radius
        for x, y in zip(ALPHA[::37], BETA[::37], strict=True)
    ]
    np.testing.assert_array_equal(together[:, ::37].T, apart)
    order = RANDOM.permutation(RAYS)
    shuffled = rt.trace(ALPHA[order], BETA[order], inclination=0.7, orders=4, **asked).radius
    np.testing.assert_array_equal(shuffled, together[:, order])


def test_kernels_give_the_same_uncompiled(plain_environment):
    found = [
        json.loads(
            subprocess.run(
                [sys.executable, "-c", TINY],
                env={**plain_environment, "NUMBA_DISABLE_JIT": disabled},
                capture_output=True,
                text=True,
                check=True,
            ).stdout
        )
        for disabled in ("0", "1")
    ]
    # Compiled code takes its sines from another library than Python: the last digits may differ.
    np.testing.assert_allclose(found[1], found[0], rtol=1e-11, atol=1e-11)


def test_the_speed_benchmark_agrees_with_its_reference(project, plain_environment):
    run = subprocess.run(
        [sys.executable, project / "benchmarks" / "trace_speed.py", "--small"],
        env=plain_environment,
        capture_output=True,
        text=True,
        check=False,
    )
    assert run.returncode == 0, run.stderr
    assert run.stdout.startswith("both agree to")
