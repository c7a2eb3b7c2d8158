"""One contract a family, which every emitter, motion and profile keeps, and which impostors must fail."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
import pytest

import emission as em
from raytrace.contract import RayStatus

# Components of the normalisation u·u = −1 cancel where u^t is large; the error grows with u^t².
NORM_TOLERANCE = 1e-13

SHORT_TABLE = em.Table(radii=(2.0, 3.0, 5.0, 9.0), values=(0.0, 2.0, 1.0, 0.5))
PROFILES = [
    em.PowerLaw(inner=2.0, outer=50.0, slope=3.7),
    em.PowerLaw(inner=2.6, outer=20.0, slope=-1.0),
    em.PowerLaw(inner=3.0, outer=12.0, slope=2.0, edge_width=1.0),
    em.GaussianRing(radius=5.0, width=1.5),
    em.GaussianRing(radius=2.5, width=3.0),
    em.PageThorne(outer=30.0),
    SHORT_TABLE,
]
FLOWS = [
    em.Static(),
    em.Circular(),
    em.RadialFall(),
    em.Blend(orbit_fraction=0.7, fall_fraction=0.5),
    em.Blend(orbit_fraction=1.0, fall_fraction=1.0),
    em.Blend(orbit_fraction=0.0, fall_fraction=0.0),
]
EMITTERS = [
    *(em.ThinDisk(profile=profile, flow=em.Circular()) for profile in PROFILES),
    *(em.ThinDisk(profile=PROFILES[0], flow=flow, spectral_index=1.0, slant=True) for flow in FLOWS),
    em.ThinDisk(profile=PROFILES[0], flow=em.Static(), opaque=True, spectral_index=-3.0),
    em.Backdrop(),
]


def check_edges(edges, *, may_be_empty=False):
    assert isinstance(edges, tuple)
    assert edges or may_be_empty
    assert all(np.isfinite(edges))
    assert all(b > a for a, b in pairwise(edges))
    assert all(edge >= 2.0 for edge in edges)


def check_profile(profile):
    """What `emission.contract.Profile` promises."""
    assert isinstance(profile, em.Profile)
    check_edges(profile.edges)
    assert isinstance(profile.bolometric, bool)
    inner, outer = profile.edges[0], profile.edges[-1]
    radius = np.concatenate([np.geomspace(2.0, 1e6, 997), profile.edges, np.nextafter(profile.edges, 0.0)])
    value = profile.brightness(radius)
    assert value.shape == radius.shape
    assert value.dtype == np.float64
    assert np.all(np.isfinite(value))
    assert np.all(value >= 0.0)
    assert np.any(value > 0.0)
    assert np.all(value[(radius < inner) | (radius > outer)] == 0.0)
    scalar = profile.brightness(float(radius[500]))
    assert np.ndim(scalar) == 0
    assert scalar == value[500]


def check_flow(flow, hole):
    """What `emission.contract.Flow` promises: future-directed, timelike, normalised, finite down to the
    horizon."""
    assert isinstance(flow, em.Flow)
    radius = np.concatenate(
        [hole.horizon * (1.0 + np.geomspace(1e-14, 1.0, 400)), np.geomspace(4.0, 1e6, 600)]
    )
    u = flow.four_velocity(radius, spacetime=hole)
    g = hole.metric(radius, np.pi / 2)
    for part in u:
        assert part.shape == radius.shape
        assert np.all(np.isfinite(part))
    assert np.all(u.t > 0.0)
    assert np.all(u.r <= 0.0)
    norm = g.tt * u.t**2 + g.rr * u.r**2 + g.phi_phi * u.phi**2 + 2.0 * g.t_phi * u.t * u.phi
    assert np.all(np.abs(norm + 1.0) <= NORM_TOLERANCE * (1.0 - g.tt * u.t**2))
    assert all(hole.horizon < kink < np.inf for kink in flow.kinks(hole))
    one = flow.four_velocity(7.0, spacetime=hole)
    assert all(np.ndim(part) == 0 for part in one)
    with pytest.raises(ValueError, match="outside the horizon"):
        flow.four_velocity([7.0, hole.horizon], spacetime=hole)


def check_emitter(emitter, hole, light):
    """What `emission.contract.Emitter` promises for crossings anywhere, and for none."""
    assert isinstance(emitter, em.Emitter)
    check_edges(emitter.edges, may_be_empty=True)
    for flag in (emitter.bolometric, emitter.opaque, emitter.scale_free):
        assert isinstance(flag, bool)
    radius = np.concatenate([[2.0, np.nextafter(2.0, 3.0)], 2.0 + np.geomspace(1e-9, 1e3, 300)])
    first = light.at(hole, radius, spin_part=1.0, impact=2.0)
    grazing = light.at(hole, radius, spin_part=2.0, impact=2.0)
    hit = light.stack(
        first, grazing, light.missed(first, RayStatus.CAPTURED), light.missed(first, RayStatus.IN_PLANE)
    )
    image = emitter.intensity(hit, spacetime=hole, frequency=2.3e11, time=0.0)
    assert image.shape == (1, 4, radius.size)
    assert image.dtype == np.float64
    assert np.all(np.isfinite(image))
    assert np.all(image >= 0.0)
    assert np.any(image > 0.0)
    assert np.all(image[:, 2:] == 0.0)
    if emitter.edges:
        off = (radius < emitter.edges[0]) | (radius > emitter.edges[-1])
        assert np.all(image[..., off] == 0.0)
    if emitter.opaque:
        assert np.all((image[0] > 0.0).sum(axis=0) <= 1)


@pytest.mark.parametrize("profile", PROFILES, ids=repr)
def test_profile_keeps_the_contract(profile):
    check_profile(profile)


@pytest.mark.parametrize("flow", FLOWS, ids=repr)
@pytest.mark.parametrize("charge", [0.0, 0.6, 1.0 - 1e-3])
def test_flow_keeps_the_contract_in_every_static_metric(flow, charge, toy):
    check_flow(flow, toy(charge))


@pytest.mark.parametrize("emitter", EMITTERS, ids=repr)
@pytest.mark.filterwarnings("error")
def test_emitter_keeps_the_contract(emitter, schwarzschild, light):
    check_emitter(emitter, schwarzschild, light)


def test_every_registered_kind_is_under_contract():
    def kinds(family, members):
        return {name for name, maker in family.items() if any(_made_by(maker, m) for m in members)}

    assert kinds(em.PROFILES, PROFILES) == set(em.PROFILES)
    assert kinds(em.FLOWS, FLOWS) == set(em.FLOWS)
    assert kinds(em.EMITTERS, EMITTERS) == set(em.EMITTERS)


def _made_by(maker, member):
    return isinstance(member, getattr(maker, "__self__", maker))


# --- controls: impostors that must be caught
# ---------------------------------------------------------------------------


@dataclass(frozen=True)
class LeakyProfile:
    """Shines outside its own edges."""

    edges = (3.0, 9.0)
    bolometric = False

    def brightness(self, radius, *, spacetime=None):
        return 1.0 / np.asarray(radius, dtype=np.float64)


@dataclass(frozen=True)
class TooFast:
    """Turns faster than light at every radius."""

    def kinks(self, spacetime=None):
        return ()

    def four_velocity(self, radius, *, spacetime=None):
        r = np.asarray(radius, dtype=np.float64)
        with np.errstate(invalid="ignore"):
            time = 1.0 / np.sqrt(1.0 - 2.0 / r - 4.0)
        return em.FourVelocity(time, np.zeros_like(r), 2.0 * time / r)


@dataclass(frozen=True)
class Unaware:
    """Shines from crossings that never happened."""

    edges = ()
    bolometric = False
    opaque = False
    scale_free = True

    def intensity(self, hit, *, spacetime, frequency, time):
        return np.ones((1, *hit.status.shape))


@dataclass(frozen=True)
class Negative(Unaware):
    """Takes light away."""

    def intensity(self, hit, *, spacetime, frequency, time):
        return -np.ones((1, *hit.status.shape))


def test_a_leaky_profile_fails_the_contract():
    with pytest.raises(AssertionError, match="all"):
        check_profile(LeakyProfile())


def test_a_flow_faster_than_light_fails_the_contract(schwarzschild):
    with pytest.raises(AssertionError, match="isfinite"):
        check_flow(TooFast(), schwarzschild)


@pytest.mark.parametrize("impostor", [Unaware(), Negative()], ids=repr)
def test_an_impostor_fails_the_contract(impostor, schwarzschild, light):
    with pytest.raises(AssertionError, match="all"):
        check_emitter(impostor, schwarzschild, light)


def test_shade_refuses_an_emitter_that_takes_light_away(schwarzschild, light):
    with pytest.raises(ValueError, match="Negative returned an intensity that is negative or not finite"):
        em.shade(Negative(), light.at(schwarzschild, [7.0]), spacetime=schwarzschild)
