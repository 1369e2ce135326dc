"""Properties of water, against the published checks and two reference libraries."""

from __future__ import annotations

import math

import CoolProp.CoolProp as reference
import iapws
import numpy as np
import pytest
from iapws import IAPWS97

from thrustbook.engine.errors import OutOfRange, Status
from thrustbook.engine.properties import saturation_pressure, viscosity, water

from ..published import load

CHECKS = load("properties")
RANGE = np.linspace(273.16, 373.1, 41).tolist()


def of_topic(topic: str) -> list[dict]:
    found = [check for check in CHECKS if check["topic"] == topic]
    assert found
    return found


def test_published_viscosity() -> None:
    for check in of_topic("viscosity"):
        assert viscosity(**check["inputs"]) == pytest.approx(check["expected"], rel=check["tolerance"])


def test_published_saturation_pressure() -> None:
    for check in of_topic("saturation"):
        found = saturation_pressure(**check["inputs"])
        assert found == pytest.approx(check["expected"], rel=check["tolerance"])


@pytest.mark.parametrize("check", of_topic("water"), ids=lambda c: f"{c['inputs']['t']} degC")
def test_published_water(check: dict) -> None:
    found = water(check["inputs"]["t"] + 273.15)
    for name, expected in check["expected"].items():
        assert getattr(found, name) == pytest.approx(expected, rel=check["tolerance"])


@pytest.mark.parametrize("T", RANGE)
def test_water_is_that_of_the_reference_formulations(T: float) -> None:
    found = water(T)
    assert found.rho == pytest.approx(reference.PropsSI("D", "T", T, "P", 101325, "Water"), rel=1e-5)
    assert found.mu == pytest.approx(reference.PropsSI("V", "T", T, "P", 101325, "Water"), rel=2e-5)
    assert found.pv == pytest.approx(reference.PropsSI("P", "T", T, "Q", 0, "Water"), rel=1e-4)
    industrial = IAPWS97(T=T, P=0.101325)
    assert found.rho == pytest.approx(industrial.rho, rel=5e-5)
    assert found.nu == pytest.approx(industrial.nu, rel=2e-4)


@pytest.mark.parametrize("T", np.linspace(273.15, 647.0, 30).tolist())
def test_saturation_is_the_same_formula_over_its_whole_range(T: float) -> None:
    assert saturation_pressure(T) == pytest.approx(1e6 * iapws.iapws97._PSat_T(T), rel=1e-12)


@pytest.mark.parametrize(("T", "rho"), [(298.15, 1200.0), (373.15, 1000.0), (433.15, 1.0), (873.15, 600.0)])
def test_viscosity_is_the_same_formula_far_outside_the_liquid(T: float, rho: float) -> None:
    assert viscosity(T, rho) == pytest.approx(iapws._iapws._Viscosity(rho, T), rel=1e-12)


def test_water_is_densest_near_four_degrees() -> None:
    T = np.linspace(273.15, 283.15, 1001)
    assert T[water(T).rho.argmax()] - 273.15 == pytest.approx(3.98, abs=0.02)


@pytest.mark.parametrize("T", [0.0, 20.0, 273.1, 373.15, math.nan, math.inf])
def test_ice_steam_and_celsius_for_kelvin_are_refused(T: float) -> None:
    with pytest.raises(OutOfRange, match=r"T = .* \(allowed: at least 273.15 and at most 373.12\)"):
        water(T)


def test_arrays_are_the_scalars_and_a_bad_element_spoils_only_itself() -> None:
    T = np.array([274.0, 293.15, 400.0, 372.0])
    values, status = water.evaluate([T])
    assert status.tolist() == [Status.OK, Status.OK, Status.OUT_OF_RANGE, Status.OK]
    for i in (0, 1, 3):
        assert [x[i] for x in values] == pytest.approx(list(water(float(T[i]))), rel=1e-14)
