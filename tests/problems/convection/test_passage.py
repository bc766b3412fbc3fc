"""Turbulent flow between plates and the ends of a stack against published laws."""

from __future__ import annotations

import fluids
import ht
import numpy as np
import pytest
from numpy.testing import assert_allclose

from problems.convection import passage
from tests.published_data import published


def test_developed_heat_is_gnielinskis():
    table = published("gnielinski")
    re = table["re_d"].to_numpy(dtype=float)
    nu = passage.developed_nusselt(re, np.full_like(re, 0.7), np.zeros_like(re))
    assert_allclose(nu, table["nu"], atol=0.006)


@pytest.mark.parametrize("pr", [0.7, 7.0, 100.0])
def test_developed_heat_agrees_with_a_reference_library(pr):
    re = np.geomspace(4000.0, 1e6, 12)
    friction = passage.darcy_friction(re)
    expected = [
        ht.conv_internal.turbulent_Gnielinski(r, pr, f) for r, f in zip(re, friction, strict=True)
    ]
    assert_allclose(
        passage.developed_nusselt(re, np.full_like(re, pr), 0.0 * re), expected, rtol=1e-9
    )


def test_smooth_tube_friction_agrees_with_a_reference_library():
    re = np.geomspace(1e4, 1e6, 12)
    expected = [fluids.friction_factor(Re=float(r), eD=0.0) for r in re]
    assert_allclose(passage.darcy_friction(re), expected, rtol=0.02)


def test_rough_friction_ratio_agrees_with_a_reference_library():
    re = np.geomspace(2e4, 1e6, 8)
    for relative in (1e-4, 1e-3, 1e-2):
        expected = [
            fluids.friction_factor(Re=float(r), eD=relative)
            / fluids.friction_factor(Re=float(r), eD=0.0)
            for r in re
        ]
        ratio = passage.roughness_ratio(re, np.full_like(re, relative))
        assert_allclose(ratio, expected, rtol=0.05)


def test_plates_carry_more_friction_than_a_tube_of_the_same_hydraulic_diameter():
    # 9 to 15 % (Jones 1976), and Dean 1978: f = 0.0868 Re_D^-1/4, both from memory
    re = np.geomspace(1e4, 1e5, 5)
    plates = passage.developed_friction(re, np.zeros_like(re))
    more = plates / (0.25 * passage.darcy_friction(re)) - 1.0
    assert np.all((more > 0.085) & (more < 0.15))
    assert_allclose(plates, 0.0868 * re**-0.25, rtol=0.06)


def test_band_is_linear_between_its_published_ends():
    # Gnielinski 2013: linear in Re between 2300 and 4000
    re = np.array([1000.0, 2180.0, 2725.0, 3150.0, 3575.0, 4110.0, 1e5])
    assert_allclose(passage.sustains(re), [0.0, 0.0, 0.25, 0.5, 0.75, 1.0, 1.0], atol=1e-12)


def test_band_has_no_kink():
    re = np.linspace(2000.0, 4300.0, 4601)
    slope = np.diff(passage.sustains(re)) / np.diff(re)
    assert np.max(np.abs(np.diff(slope))) < 0.01 * slope.max()


@pytest.mark.parametrize(
    ("porosity", "cc", "kc", "ke"), [(0.5, 0.6444, 0.305, 0.25), (0.8, 0.7223, 0.148, 0.04)]
)
def test_ends_have_the_computed_coefficients(porosity, cc, kc, ke):
    # Kays 1950, formulas re-derived from Bernoulli and momentum (computed), flat profile
    sigma = np.array([porosity])
    assert_allclose(passage.contraction(sigma, "sharp"), cc, atol=1e-4)
    assert_allclose(passage.entrance_loss(sigma, "sharp") - 1.0 + sigma**2, kc, atol=6e-4)
    recovered = passage.exit_recovery(sigma, np.ones(1), "sharp")
    assert_allclose(1.0 - sigma**2 - recovered, ke, atol=1e-9)


def test_contraction_has_its_limits():
    # free slot 0.611, no wall 1
    assert_allclose(passage.contraction(np.array([1e-4, 1.0]), "sharp"), [0.611, 1.0], atol=5e-4)


def test_contraction_solves_the_law_of_the_plane_jet():
    porosity = np.linspace(0.02, 1.0, 60)
    cc = passage.contraction(porosity, "sharp")
    z = cc * porosity
    law = 1.0 / (1.0 + 2.0 / np.pi * (1.0 - z * z) / z * np.arctan(z))
    assert_allclose(cc, law, atol=2e-5)


def test_ends_vanish_where_they_are_not_counted():
    sigma = np.linspace(0.3, 1.0, 5)
    assert np.all(passage.entrance_loss(sigma, "none") == 0.0)
    assert np.all(passage.exit_recovery(sigma, 1.2 + 0.0 * sigma, "none") == 0.0)
