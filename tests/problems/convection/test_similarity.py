"""The similarity solutions of one plate against exact relations and known constants."""

from __future__ import annotations

import pytest
from numpy.testing import assert_allclose

from problems.convection import flat_plate
from problems.convection.similarity import Similarity


@pytest.fixture(scope="module")
def plate() -> Similarity:
    return Similarity()


def test_displacement_thickness_is_that_of_blasius(plate):
    """1.7208: Blasius 1908; computed."""
    assert_allclose(plate.displacement, 1.720788, rtol=1e-6)


def test_heat_and_momentum_are_alike_at_pr_1(plate):
    """Reynolds' analogy, exact: temperature equals velocity."""
    assert_allclose(plate.temperature(1.0), plate.velocity, atol=1e-5)
    assert_allclose(plate.heat_constant(1.0, flux=False), 0.332057, rtol=3e-5)


def test_thin_temperature_layers_follow_their_asymptotes(plate):
    """Linear velocity in the layer: 0.3387 and 0.4637 Pr^1/3 (Churchill and Ozoe, from memory)."""
    root = 1e5 ** (1.0 / 3.0)
    assert_allclose(plate.heat_constant(1e5, flux=False) / root, 0.3387, rtol=3e-4)
    assert_allclose(plate.heat_constant(1e5, flux=True) / root, 0.4637, rtol=3e-4)


@pytest.mark.parametrize("flux", [False, True])
@pytest.mark.parametrize("pr", [0.5, 0.7, 3.0, 100.0, 1e4])
def test_the_law_of_one_plate_meets_them(plate, pr, flux):
    law = flat_plate.laminar_heat_constant(pr, flux)
    assert_allclose(law, plate.heat_constant(pr, flux), rtol=5e-4)
