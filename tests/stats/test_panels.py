"""Panels reproduce what they were fitted to: polynomials exactly, analytic functions to the last digits."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sameline.stats.panels import fit_panels

LAYOUTS = [(0.0, 4.0, 4.0, 0.5, 0.5), (-2.0, 1.0, 9.0, 0.5, 2.0), (3.0, 3.0 + 2.0, 3.0 + 8.0, 1.0, 3.0)]


@given(st.lists(st.integers(-3, 3), min_size=6, max_size=6), st.sampled_from(LAYOUTS))
@settings(max_examples=40, deadline=None)
def test_a_polynomial_of_the_panels_degree_comes_back(coefficients: list[int], layout: tuple[float, ...]):
    whole = np.polynomial.Polynomial(coefficients)
    panels = fit_panels(whole, layout, 6)
    x = np.linspace(layout[0], layout[2], 301)
    size = 1.0 + np.abs(whole(x)).max()
    assert np.allclose(panels(x), whole(x), rtol=0, atol=1e-13 * size)
    assert np.allclose(panels.slope(x), whole.deriv()(x), rtol=0, atol=1e-12 * size)


@pytest.mark.parametrize("layout", LAYOUTS)
def test_an_analytic_function_is_met_to_rounding(layout: tuple[float, ...]):
    panels = fit_panels(lambda x: np.exp(-x / 2) * np.cos(x), layout, 18)
    x = np.linspace(layout[0], layout[2], 1001)
    assert np.allclose(panels(x), np.exp(-x / 2) * np.cos(x), rtol=0, atol=3e-14 * np.exp(-layout[0] / 2))


def test_few_terms_miss():
    panels = fit_panels(lambda x: np.cos(4 * x), (0.0, 4.0, 4.0, 1.0, 1.0), 4)
    x = np.linspace(0, 4, 101)
    assert np.abs(panels(x) - np.cos(4 * x)).max() > 1e-3


def test_edges_belong_to_their_panels():
    panels = fit_panels(np.sin, (0.0, 2.0, 8.0, 0.5, 2.0), 14)
    edges = np.array([0.0, 0.5, 2.0, 4.0, 8.0])
    assert np.allclose(panels(edges), np.sin(edges), rtol=0, atol=1e-11)
    assert panels.powers.shape == (14, 7)
    assert not panels.powers.flags.writeable
