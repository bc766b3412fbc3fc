"""Units: text to SI, SI to text, and both ways round."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from problems.kinds.outcomes import OUTCOMES, SETTINGS
from problems.units import QuantityError, axis_unit, format_value, shown, suffix, to_si

UNITS = sorted(
    {item.unit for group in (OUTCOMES, SETTINGS) for kind in group.values() for item in kind}
)


@pytest.mark.parametrize(
    ("text", "unit", "wanted"),
    [
        ("40 mm", "m", 0.04),
        ("40mm", "m", 0.04),
        (" 40  mm ", "m", 0.04),
        ("250 um", "m", 2.5e-4),
        ("250 \u00b5m", "m", 2.5e-4),
        ("250 \u03bcm", "m", 2.5e-4),
        ("1 inch", "m", 0.0254),  # exact by definition
        ("25 degC", "K", 298.15),
        ("25 °C", "K", 298.15),
        ("-40 degF", "K", 233.15),  # the two scales meet at -40
        ("300 K", "K", 300.0),
        ("5 K", "delta K", 5.0),
        ("150 m3/h", "m3/s", 150.0 / 3600.0),
        ("150 m³/h", "m3/s", 150.0 / 3600.0),
        ("150 m^3/h", "m3/s", 150.0 / 3600.0),
        ("150 m**3/h", "m3/s", 150.0 / 3600.0),
        ("12 l/s", "m3/s", 0.012),
        ("8 kW", "W", 8000.0),
        ("1 hPa", "Pa", 100.0),
        ("1 mbar", "Pa", 100.0),
        ("101.325 kPa", "Pa", 101325.0),
        ("1 bar", "Pa", 1e5),
        ("6 %", "1", 0.06),
        ("6%", "1", 0.06),
        ("0.3", "m", 0.3),
        ("5e5", "1", 5e5),
        (".5", "1", 0.5),
        ("400 W/m2", "W/m2", 400.0),
        ("4 kW/m²", "W/m2", 4000.0),
        ("35 W/(m2 K)", "W/(m2 K)", 35.0),
        ("35 W/m2/K", "W/(m2 K)", 35.0),
        ("35 W/(m²·K)", "W/(m2 K)", 35.0),
        ("2.7 g/cm3", "kg/m3", 2700.0),
        ("36 km/h", "m/s", 10.0),
        (0.3, "m", 0.3),
        (300, "K", 300.0),
    ],
)
def test_a_quantity_is_read_in_si(text, unit, wanted):
    assert to_si(text, unit) == pytest.approx(wanted, rel=1e-12)


@pytest.mark.parametrize(
    ("value", "unit"),
    [
        ("3 parsnips", "m"),
        ("3 kg", "m"),
        ("3 m 5", "m"),
        ("3,5 m", "m"),
        ("m", "m"),
        ("", "m"),
        ("1e999 m", "m"),
        ("nan m", "m"),
        ("9**9**9 m", "m"),
        ("3 m**999999999", "m"),
        ("3 m2222222", "m"),
        ("3 (m", "m"),
        ("3 m/", "m"),
        ("3 __class__", "m"),
        ("5 degC", "delta K"),
        ("5 degC/m", "K"),
        ("5 mm", "1"),
        (math.inf, "m"),
        (math.nan, "m"),
        (10**400, "m"),
        (True, "m"),
        (None, "m"),
        (["3 mm"], "m"),
        ("NAN", "1"),
        ("3 A0", "1"),
        ({}, "m"),
    ],
)
def test_what_is_no_quantity_of_the_unit_is_refused(value, unit):
    with pytest.raises(QuantityError):
        to_si(value, unit)


@given(st.text(max_size=12), st.sampled_from(UNITS))
def test_any_text_is_a_finite_quantity_or_refused(text, unit):
    for given_text in (text, f"3 {text}"):
        try:
            number = to_si(given_text, unit)
        except QuantityError:
            continue
        assert math.isfinite(number)


@pytest.mark.parametrize("unit", UNITS)
@given(size=st.floats(1e-6, 1e9), sign=st.sampled_from([-1.0, 1.0]))
def test_what_is_shown_is_read_back_to_four_digits(unit, size, sign):
    value = abs(size) if unit == "K" else sign * size
    tolerance = 0.051 if unit == "K" else 0.0
    back = to_si(format_value(value, unit), unit)
    assert back == pytest.approx(value, rel=5.1e-4, abs=tolerance)


@pytest.mark.parametrize("unit", UNITS)
@given(value=st.floats(-1e6, 1e6))
def test_a_shown_number_is_the_label_s_own(unit, value):
    label, factor, offset = shown(unit, value)
    text = f"{value * factor + offset!r} {label}"
    assert to_si(text, unit) == pytest.approx(value, rel=1e-9, abs=1e-9)


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        (0.04, "m", "40 mm"),
        (0.99999, "m", "1000 mm"),
        (1.2, "m", "1.2 m"),
        (0.0, "m", "0 mm"),
        (298.15, "K", "25 °C"),
        (273.15, "K", "0 °C"),
        (5.0, "delta K", "5 K"),
        (9999.0, "W", "9999 W"),
        (12345.0, "W", "12.35 kW"),
        (-12345.0, "W", "-12.35 kW"),
        (0.5, "m3/s", "1800 m³/h"),
        (151.26, "Pa", "151.3 Pa"),
        (101325.0, "Pa", "101.3 kPa"),
        (2345.6, "1", "2346"),
        (123456.0, "1", "123500"),
        (1.35e6, "1", "1.35e6"),
        (999_960.0, "1", "1e6"),
        (0.00012345, "N", "0.0001234 N"),
        (1.5e-6, "N", "1.5e-6 N"),
        (21.22, "W/(m2 K)", "21.22 W/(m² K)"),
        (math.inf, "1", "inf"),
    ],
)
def test_a_value_is_shown_as_an_engineer_prints_it(value, unit, text):
    assert format_value(value, unit) == text


@pytest.mark.parametrize(
    ("unit", "values", "label", "shown_values"),
    [
        ("m", [0.05, 1.2], "m", [0.05, 1.2]),
        ("m", [[0.05], [0.2]], "mm", [[50.0], [200.0]]),
        ("K", [293.15, 333.15], "°C", [20.0, 60.0]),
        ("W", [2e3, -2e4], "kW", [2.0, -20.0]),
        ("W", [], "W", []),
        ("Pa", [math.nan, 5.0, math.inf], "Pa", [math.nan, 5.0, math.inf]),
    ],
)
def test_an_axis_has_one_unit_that_suits_its_largest_value(unit, values, label, shown_values):
    found, to_axis = axis_unit(unit, values)
    assert found == label
    np.testing.assert_allclose(to_axis(values), shown_values, rtol=1e-12)


def test_every_outcome_and_setting_has_a_column_of_its_own():
    for kind in OUTCOMES:
        columns = [item.column for item in (*OUTCOMES[kind], *SETTINGS[kind])]
        assert len(set(columns)) == len(columns)
    assert suffix("m/s") == "_m_s"
