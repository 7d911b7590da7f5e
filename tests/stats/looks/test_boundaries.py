"""Boundaries over looks: published constants, an exact recursion, and single-look quantiles."""

import math

import numpy as np
import pytest
from scipy import stats

from sameline.errors import StatsError
from sameline.stats.looks.boundaries import History, foreseen_boundaries, next_boundaries
from sameline.stats.looks.spending import rate_that_spends, spent
from sameline.stats.studentized_range import studentized_range_isf

TWO = tuple((40 * look, 40 * look) for look in range(1, 6))


def crossing_chances(boundaries):
    """Chance of first crossing |z| > b at each of equally spaced looks, known variance, two groups.

    The recursion of Armitage, McPherson and Rowe 1969, JRSS A 132:235-244: the density of the sum of increments of
    those not yet across is carried from look to look.
    """
    step = 0.004
    x = np.arange(-12, 12 + step / 2, step)
    density, chances = None, []
    for look, b in enumerate(boundaries, start=1):
        if density is None:
            density = stats.norm.pdf(x)
        else:
            kernel = stats.norm.pdf(np.arange(-8, 8 + step / 2, step))
            density = np.convolve(density, kernel, mode="same") * step
        outside = np.clip((np.abs(x) + step / 2 - b * math.sqrt(look)) / step, 0, 1)  # part of each cell
        chances.append(float((density * outside).sum() * step))
        density = density * (1 - outside)
    return chances


@pytest.mark.parametrize(
    ("constant", "shape"),
    [
        # Jennison and Turnbull 2000, Group Sequential Methods, tables 2.1 and 2.3 (K = 5, alpha = 0.05, two-sided)
        (2.413, lambda _: 1.0),
        (2.040, lambda look: math.sqrt(5 / look)),
    ],
)
def test_published_constants_spend_alpha(constant, shape):
    for off, above in ((-0.0006, True), (0.0006, False)):
        total = sum(crossing_chances([(constant + off) * shape(look) for look in range(1, 6)]))
        assert (total > 0.05) == above


@pytest.mark.parametrize("shape", [lambda _: 1.0, lambda look: math.sqrt(5 / look)])
def test_simulated_histories_cross_published_boundaries_as_often_as_published(shape):
    from sameline.stats.looks.boundaries import _simulate

    constant = 2.413 if shape(1) == 1.0 else 2.040
    edges = tuple((math.sqrt(2) * constant * shape(look),) for look in range(1, 5))
    draws = 400_000
    last, before = _simulate(History(TWO, edges, known_spread=True), 1, draws, 3)
    crossed = before[0] | (last > math.sqrt(2) * constant)
    assert crossed.mean() == pytest.approx(0.05, abs=3 * math.sqrt(0.05 * 0.95 / draws))


@pytest.mark.parametrize(
    ("spending", "published"),
    [
        # Lan and DeMets' two functions, five equal looks, alpha 0.05 two-sided; figures as tabulated in Reboussin,
        # DeMets, Kim and Lan 2000, Control. Clin. Trials 21:190-207 (from memory)
        ("obrien-fleming", (4.877, 3.357, 2.680, 2.290, 2.031)),
        ("pocock", (2.438, 2.427, 2.410, 2.397, 2.386)),
    ],
)
def test_spending_gives_the_published_boundaries(spending, published):
    done = []
    for look in range(1, 6):
        history = History(TWO[:look], tuple(done), known_spread=True)
        done.append(next_boundaries(history, (0.05,), spending, ((look - 1) / 5, look / 5), draws=1_000_000, seed=1))
    found = [edge / math.sqrt(2) for (edge,) in done]
    assert found[0] == pytest.approx(published[0], abs=6e-4)  # by the exact tail or by simulation
    assert found == pytest.approx(published, abs=0.012)
    increments = np.diff([0.0, *(spent(spending, look / 5, 0.05) for look in range(1, 6))])
    chances = crossing_chances(found)
    assert chances == pytest.approx(increments, abs=4 * math.sqrt(0.02 / 1_000_000))


@pytest.mark.parametrize("n", [(5, 5, 5, 5), (9, 3, 4, 2)])
def test_one_look_that_spends_all_is_tukey_and_for_unequal_sizes_no_more(n):
    edge = next_boundaries(History((n,), ()), (0.05,), "pocock", (0.0, 1.0), draws=400_000, seed=2)[0]
    tukey = float(studentized_range_isf(0.05, 4, sum(n) - 4))
    # Hayter 1984: Tukey-Kramer is conservative for unequal sizes
    assert edge <= tukey + 1e-4
    assert edge >= tukey * (0.99 if len(set(n)) == 1 else 0.95)


def test_the_same_seed_gives_the_same_boundary_and_a_group_may_come_late():
    history = History(((3, 3, 0), (6, 6, 3)), ((9.0,),))
    first = next_boundaries(history, (0.05,), "pocock", (0.3, 0.7), draws=50_000, seed=9)
    assert first == next_boundaries(history, (0.05,), "pocock", (0.3, 0.7), draws=50_000, seed=9)
    assert first != next_boundaries(history, (0.05,), "pocock", (0.3, 0.7), draws=50_000, seed=10)


def test_a_foreseen_plan_is_the_plan_look_by_look():
    n, fractions, done = ((3, 3, 3), (6, 6, 6), (9, 9, 9)), (0.3, 0.7, 1.0), []
    for look in range(3):
        history = History(n[: look + 1], tuple(done))
        step = ((0.0, *fractions)[look], fractions[look])
        done.append(next_boundaries(history, (0.05,), "pocock", step, draws=50_000, seed=3))
    assert foreseen_boundaries(n, 0.05, "pocock", fractions, draws=50_000, seed=3) == tuple(edge for (edge,) in done)


def test_no_boundary_without_degrees_of_freedom_or_two_groups():
    for n in ((1, 1, 1), (5, 0, 0)):
        assert next_boundaries(History((n,), ()), (0.05,), "pocock", (0.0, 0.5), draws=10_000, seed=1) == (None,)


@pytest.mark.parametrize("spending", ["obrien-fleming", "pocock"])
def test_spending_rises_from_nothing_to_alpha(spending):
    rates = [spent(spending, t, 0.05) for t in np.linspace(0, 1, 41)]
    assert rates[0] == 0.0
    assert rates[-1] == 0.05
    assert (np.diff(rates) >= 0).all()
    assert spent(spending, 1.7, 0.05) == 0.05


@pytest.mark.parametrize("spending", ["obrien-fleming", "pocock"])
def test_the_rate_that_spends_is_the_inverse(spending):
    for alpha in (1e-6, 0.003, 0.2):
        step = spent(spending, 0.6, alpha) - spent(spending, 0.4, alpha)
        assert rate_that_spends(spending, 0.4, 0.6, step) == pytest.approx(alpha, rel=1e-6)
    assert rate_that_spends(spending, 0.4, 0.5, 0.99) == 1.0


def test_bad_spending_is_refused():
    for call in (("even", 0.5, 0.05), ("pocock", -0.1, 0.05), ("pocock", 0.5, 1.5)):
        with pytest.raises(StatsError):
            spent(*call)
