"""The free response against closed forms, 50-digit arithmetic, conservation and superposition."""

from __future__ import annotations

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import vib
from vib.response.ring import ring
from vib.system import DampingLaw, System

# MDOF-2 of the project's reference collection (two masses, three springs), damped as in MDOF-RAYL.
MASS = np.diag([12.0, 5.0])
STIFFNESS = np.array([[25000.0, -7000.0], [-7000.0, 9500.0]])
CHAIN = System(mass=MASS, stiffness=STIFFNESS, damping=0.8 * MASS + 4e-4 * STIFFNESS)

# MDOF-NP1, NP2, NP3 and MDOF-OD2 of the same collection: non-proportional, mixed, overdamped.
CASES = {
    "proportional": CHAIN,
    "NP1": System(
        mass=[[2.0, 0], [0, 1]], damping=[[0, 0], [0, 0.9]], stiffness=[[35.0, -15.0], [-15.0, 15.0]]
    ),
    "NP2": System(
        mass=np.diag([1.5, 0.8]),
        damping=[[2.1, -1.7], [-1.7, 1.7]],
        stiffness=[[60.0, -20.0], [-20.0, 20.0]],
    ),
    "NP3": System(
        mass=np.eye(2), damping=[[9.0, -9.0], [-9.0, 9.3]], stiffness=[[50.0, -20.0], [-20.0, 30.0]]
    ),
    "OD2": System(
        mass=[[1.0, 0], [0, 2]], damping=[[25.0, -5], [-5, 30.0]], stiffness=[[30.0, -10], [-10, 40.0]]
    ),
    "undamped": System(mass=MASS, stiffness=STIFFNESS),
    "critical": System(mass=np.diag([2.0, 3.0]), damping=np.diag([8.0, 0.3]), stiffness=np.diag([8.0, 5.0])),
    "critical, coupled": System(
        mass=np.eye(2), damping=[[3.0, -1.0], [-1.0, 3.0]], stiffness=[[2.0, -1.0], [-1.0, 2.0]]
    ),
    "gyroscopic": System(
        mass=np.eye(2),
        gyroscopic=[[0, 3.0], [-3.0, 0]],
        stiffness=np.diag([4.0, 9.0]),
        damping=0.1 * np.eye(2),
    ),
    "flutter side": System(
        mass=np.eye(2), stiffness=[[4.0, 1.5], [-1.5, 9.0]], damping=0.4 * np.eye(2), unsymmetric=True
    ),
    "free": System(
        mass=np.diag([1.0, 3.0]), stiffness=[[90.0, -90], [-90, 90]], damping=[[0.2, -0.2], [-0.2, 0.2]]
    ),
    "free with a brake": System(
        mass=np.diag([1.0, 3.0]), stiffness=[[90.0, -90], [-90, 90]], damping=[[0.5, 0], [0, 0]]
    ),
}


def exact(system, displacement, velocity, times):
    """[q, q', q''] with 50 digits: the Taylor exponential of the companion matrix, by mpmath."""
    size = system.size
    velocity_terms = np.zeros((size, size))
    for part in (system.damping, system.gyroscopic):
        velocity_terms = velocity_terms if part is None else velocity_terms + part
    with mpmath.workdps(50):
        inverse = mpmath.inverse(mpmath.matrix(np.asarray(system.mass).tolist()))
        lower = [
            -(inverse * mpmath.matrix(np.asarray(m).tolist())) for m in (system.stiffness, velocity_terms)
        ]
        a = mpmath.zeros(2 * size)
        for i in range(size):
            a[i, size + i] = mpmath.mpf(1)
            for j in range(size):
                a[size + i, j], a[size + i, size + j] = lower[0][i, j], lower[1][i, j]
        start = mpmath.matrix([*map(float, displacement), *map(float, velocity)])
        states = [mpmath.expm(a * mpmath.mpf(float(t))) * start for t in times]
        rates = [a * state for state in states]
    both = np.array([[float(x) for x in state] for state in states])
    slopes = np.array([[float(x) for x in rate] for rate in rates])
    return both[:, :size], both[:, size:], slopes[:, size:]


def test_reference_free_response():
    """STM-FREE2 of the reference collection: modal superposition, checked there by scipy's expm."""
    rows = np.array(
        [
            [0.05, -0.00385482558539, 0.013669977569],
            [0.37, 0.00269987970236, 0.0007637006058],
            [1.5, 0.00111120916138, -0.00199741294373],
        ]
    )
    found = CHAIN.ring(displacement=[0.01, -0.004], velocity=[0, 0.3], times=rows[:, 0])
    np.testing.assert_allclose(found.displacement_m, rows[:, 1:], rtol=0, atol=1e-12)
    np.testing.assert_array_equal(found.time_s, rows[:, 0])
    assert found.freedoms == ("1", "2")
    assert found.method == "eigenvalues"
    assert found.truncation == 0


@pytest.mark.parametrize("name", CASES)
def test_every_kind_of_system_with_50_digits(name):
    system = CASES[name]
    times = np.array([0.7, 0.0, 0.05, 2.9, 0.7])  # any order, repeated
    start, speed = np.array([0.01, -0.004]), np.array([-0.2, 0.3])
    found = ring(system, displacement=start, velocity=speed, times=times)
    expected = exact(system, start, speed, times)
    for got, want in zip(
        (found.displacement_m, found.velocity_m_s, found.acceleration_m_s2), expected, strict=True
    ):
        # 1e-11 of the largest: the splitting into eigenvalues is allowed a condition worth four digits
        np.testing.assert_allclose(got, want, rtol=0, atol=1e-11 * np.abs(want).max())


@pytest.mark.parametrize(
    ("name", "method"),
    [
        ("NP2", "eigenvalues"),
        ("critical", "eigenvalues, with the matrix exponential where they cannot be told apart"),
        ("free", "eigenvalues, with the matrix exponential where they cannot be told apart"),
    ],
)
def test_method_is_reported(name, method):
    found = ring(CASES[name], velocity=[0.1, 0.0], times=[1.0])
    assert found.method == method
    assert 1 <= found.condition < 1e5


def test_critically_damped_mass():
    """x0 (1 + w t) exp(-w t), closed form of the double root."""
    system = System(mass=[[2.0]], damping=[[8.0]], stiffness=[[8.0]])
    found = system.ring(displacement=0.01, at="1")
    t = found.time_s
    np.testing.assert_allclose(found.displacement_m[:, 0], 0.01 * (1 + 2 * t) * np.exp(-2 * t), atol=1e-15)
    assert found.method == "matrix exponential"
    (row,) = found.modes
    assert row.clustered
    assert row.damping_ratio == pytest.approx(1, abs=1e-12)
    assert row.logarithmic_decrement is None


random_systems = st.integers(1, 4).flatmap(
    lambda n: st.tuples(
        st.lists(st.floats(0.5, 3), min_size=n, max_size=n),
        st.lists(st.floats(-1, 1), min_size=n * n, max_size=n * n),
        st.lists(st.floats(-0.5, 0.5), min_size=n * n, max_size=n * n),
        st.lists(st.floats(-1, 1), min_size=2 * n, max_size=2 * n),
    )
)


def build(numbers, damped=True):
    masses, springs, dampers, start = numbers
    n = len(masses)
    spring, damper = np.reshape(springs, (n, n)), np.reshape(dampers, (n, n))
    stiffness = spring @ spring.T + 0.1 * np.eye(n)
    damping = (damper + damper.T) @ (damper + damper.T) if damped else None
    return System(mass=np.diag(masses), stiffness=stiffness, damping=damping), np.array(start)


@settings(max_examples=30, deadline=None)
@given(random_systems)
def test_random_systems_obey_their_equation_of_motion(numbers):
    system, start = build(numbers)
    n = system.size
    if not start.any():
        return
    found = ring(system, displacement=start[:n], velocity=start[n:], times=np.linspace(0, 9, 40))
    inertia = found.acceleration_m_s2 @ system.mass
    rest = inertia + found.velocity_m_s @ system.damping + found.displacement_m @ system.stiffness
    size = np.abs(inertia).max() + np.abs(found.displacement_m).max()
    assert np.abs(rest).max() <= 1e-9 * size
    np.testing.assert_allclose(found.displacement_m[0], start[:n], atol=1e-10)
    np.testing.assert_allclose(found.velocity_m_s[0], start[n:], atol=1e-10)


@settings(max_examples=30, deadline=None)
@given(random_systems)
def test_energy_of_undamped_systems_is_constant(numbers):
    system, start = build(numbers, damped=False)
    n = system.size
    if not np.abs(start).max() > 1e-6:
        return
    found = ring(system, displacement=start[:n], velocity=start[n:], times=np.linspace(0, 200, 50))
    kinetic = np.einsum("ki,ij,kj->k", found.velocity_m_s, system.mass, found.velocity_m_s)
    strain = np.einsum("ki,ij,kj->k", found.displacement_m, system.stiffness, found.displacement_m)
    np.testing.assert_allclose(kinetic + strain, (kinetic + strain)[0], rtol=1e-11)
    assert "The system has no damping: nothing decays." in found.remarks


def test_superposition():
    times = np.linspace(0, 1, 30)
    one = ring(CHAIN, impulse=3.0, at="1", times=times)
    two = ring(CHAIN, pull=50.0, at="2", times=times)
    state = ring(
        CHAIN,
        displacement=np.linalg.solve(STIFFNESS, [0, 50.0]),
        velocity=[3.0 / 12.0, 0],
        times=times,
    )
    both = one.displacement_m + two.displacement_m
    np.testing.assert_allclose(state.displacement_m, both, atol=1e-14 * np.abs(both).max())


def test_impulse_is_an_initial_velocity():
    times = [0.0, 0.01, 0.2]
    struck = CHAIN.ring(impulse="12 N s", at="2", times=times)
    thrown = CHAIN.ring(velocity="2.4 m/s", at="2", times=times)
    np.testing.assert_allclose(struck.displacement_m, thrown.displacement_m, atol=1e-15)
    np.testing.assert_allclose(struck.velocity_m_s[0], [0, 2.4], atol=1e-14)
    assert np.abs(struck.displacement_m[0]).max() < 1e-16


def test_pull_and_release_starts_from_the_static_shape_at_rest():
    found = CHAIN.ring(pull="1 kN", at="1", times=[0.0, 0.3])
    np.testing.assert_allclose(found.displacement_m[0], np.linalg.solve(STIFFNESS, [1000.0, 0]), rtol=1e-13)
    assert np.abs(found.velocity_m_s[0]).max() < 1e-14
    pulled = CHAIN.ring(displacement="3 mm", at="2", times=[0.0])
    shape = np.linalg.solve(STIFFNESS, [0, 1.0])
    np.testing.assert_allclose(pulled.displacement_m[0], 0.003 * shape / shape[1], rtol=1e-13)


def test_damping_law_gives_the_ratios_it_states():
    system = System(mass=MASS, stiffness=STIFFNESS, damping_law=DampingLaw(ratio=0.02))
    ratios = np.array([row.damping_ratio for row in system.ring(impulse=1.0, at="1").modes], float)
    np.testing.assert_allclose(ratios, 0.02, rtol=1e-12)
    np.testing.assert_allclose(ratios, system.modes().damping_ratios, rtol=1e-12)


def test_eigenvalues_are_those_of_the_modes():
    for name in ("proportional", "NP1", "NP3", "OD2"):
        found = ring(CASES[name], impulse=1.0, at="1", times=[0.0]).contributions.eigenvalues
        expected = CASES[name].modes().eigenvalues
        np.testing.assert_allclose(np.sort_complex(found), np.sort_complex(expected), rtol=1e-10)


def test_free_body_drifts_and_the_drift_does_not_decay():
    """Momentum: 4 N s on 1 kg + 3 kg moves the centre of mass at exactly 1 m/s."""
    found = CASES["free"].ring(impulse=4.0, at="1", duration="500 s")
    centre = found.displacement_m @ [0.25, 0.75]
    np.testing.assert_allclose(centre, found.time_s, rtol=1e-12, atol=1e-12)
    assert any("drifts away" in remark for remark in found.remarks)
    assert found.falls[0].envelope_to_10_percent_s is None
    rigid = found.modes[0]
    assert (rigid.frequency_hz, rigid.damping_ratio, rigid.clustered) == (0.0, None, True)


def test_braked_free_body_comes_to_rest_elsewhere():
    """With a dashpot to ground the momentum is used up after the path impulse / dashpot = 4 / 0.5 m."""
    found = CASES["free with a brake"].ring(impulse=4.0, at="1")
    np.testing.assert_allclose(found.contributions.constant, [8.0, 8.0], rtol=1e-12)
    np.testing.assert_allclose(found.displacement_m[-1], 8.0, rtol=0.02)
    assert any("comes to rest away" in remark for remark in found.remarks)


def test_unstable_system_says_so_first_and_stops_before_infinity():
    system = System(mass=[[1.0]], damping=[[-0.5]], stiffness=[[4.0]])
    found = system.ring(impulse=1.0, at="1", duration=5.0)
    assert not found.stable
    assert found.remarks[0].startswith("The system is unstable")
    with pytest.raises(vib.errors.AccuracyError, match="grows past the largest number"):
        system.ring(impulse=1.0, at="1", times=[1.0, 5000.0])


def test_massless_freedom_follows_statically():
    """A spring pair with a massless middle node is one spring of half the stiffness."""
    system = System(mass=np.diag([1.0, 0.0]), stiffness=[[100.0, -100.0], [-100.0, 200.0]])
    found = system.ring(velocity=0.5, at="1", times=np.linspace(0, 1, 7))
    omega = np.sqrt(50.0)
    np.testing.assert_allclose(
        found.displacement_m[:, 0], 0.5 / omega * np.sin(omega * found.time_s), atol=1e-15
    )
    np.testing.assert_allclose(found.displacement_m[:, 1], found.displacement_m[:, 0] / 2, atol=1e-15)


def test_massless_freedom_with_a_dashpot_lags():
    """Spring and dashpot in series hold a mass (a lag): third order, roots by mpmath."""
    m, k, c = 2.0, 80.0, 6.0
    system = System(mass=np.diag([m, 0.0]), stiffness=[[k, -k], [-k, k]], damping=[[0, 0], [0, c]])
    times = np.linspace(0, 2, 9)
    found = system.ring(velocity=[0.3, 0.0], times=times)
    # m x'' + k (x - z) = 0, c z' = k (x - z): s (m c s^2 + m k s + c k) = 0 for x and z
    roots = np.array([complex(root) for root in mpmath.polyroots([c * k, m * k, m * c], asc=True)] + [0j])
    basis = np.array([[1, 1, 1], roots, [k / (c * s + k) for s in roots]])
    weights = np.linalg.solve(basis, [0.0, 0.3, 0.0])
    expected = (np.exp(np.outer(times, roots)) @ weights).real
    np.testing.assert_allclose(found.displacement_m[:, 0], expected, atol=1e-14)
    assert found.displacement_m[0, 1] == pytest.approx(0, abs=1e-15)


@pytest.mark.parametrize(
    ("stiffness", "remarked"),
    [(1.0, False), (1e-20, True), (1e-30, False)],
    ids=["ordinary", "eigenvalues just serve", "matrix exponential"],
)
def test_very_slow_motion(stiffness, remarked):
    """A spring next to nothing: within 1 s only the first 1e-10 or 1e-15 of a period is seen."""
    system = System(mass=[[1.0]], stiffness=[[stiffness]])
    found = system.ring(impulse=1.0, at="1", duration=1.0)
    assert any("nearly cancel" in remark for remark in found.remarks) == remarked
    expected = np.sin(np.sqrt(stiffness)) / np.sqrt(stiffness)
    assert found.displacement_m[-1, 0] == pytest.approx(expected, rel=1e-5 if remarked else 1e-13)


def test_motion_lost_in_cancellation_is_an_error():
    system = System(mass=[[1.0]], stiffness=[[1e-22]])
    with pytest.raises(vib.errors.AccuracyError, match="cancel so far that rounding is"):
        system.ring(impulse=1.0, at="1", duration=1e-3)
