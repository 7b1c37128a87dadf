"""Every way to sense, as a user writes it, against values worked out outside: from YAML to a level.

Sources: RC and admittance relations from v(t) = V(1 - e^(-t/RC)) and |Y| = 2πfC (any text on circuits), the values
worked out from them; density of water by IAPWS-95 (998.2072 kg/m3 at 20 °C); ISO 9613-1 for the speed of sound; linear
scaling for 4-20 mA; Malmberg and Maryott 1956 for the permittivity of water.
"""

import math
from pathlib import Path

import pytest

from gateway.measure.reading import convert
from gateway.measure.status import Status
from gateway.settings.assemble import plant_plan
from gateway.settings.load import load_texts

SITE = """site: trial
broker: {url: mqtt://127.0.0.1:1883}
sensors:
  air: {topic: air, senses: pressure, unit: hPa, expect_every: 1 min}
"""
TANK = """tank: t
shape: {form: rectangular, length: 1 m, width: 1 m, height: 9 m}
brim: 8 m
sensors:
  warm: {topic: w, senses: temperature, unit: degC, expect_every: 1 min}
  s: {topic: s, expect_every: 1 s, SENSOR}
level: s
"""
LINE = "calibration: {points: [[100 pF, 0 m], [470 pF, 2 m]]}"


def level_of(sensor: str, raw: float, felt: dict[str, float] | None = None) -> float:
    """Return the level that a raw value reads as."""
    texts = {"site.yaml": SITE, "tanks/t.yaml": TANK.replace("SENSOR", sensor)}
    plan = next(one for one in plant_plan(load_texts(texts, Path("nowhere"))).sensors if one.name == "t.s")
    assert plan.method is not None
    method = plan.method
    if felt is not None:
        assert plan.method_at is not None
        method = plan.method_at(felt)
    found = convert(plan, method, raw)
    assert found.level is not None, found.reason
    assert found.status in {Status.GOOD, Status.OUT_OF_SPECIFICATION}
    return found.level


def of_farad(picofarad: float) -> float:
    """Return the level of the calibration above."""
    return (picofarad - 100) / 370 * 2


CASES = {
    "voltage of 1 to 5 V": ("senses: voltage, signal: [1 V, 5 V], span: [0 m, 2.5 m]", 3.0, 1.25),
    "current as pressure in water by figure": (
        "senses: current, span: [0 mbar, 250 mbar], density: 998.2072 kg/m3",
        12.0,
        2.55387 / 2,
    ),
    "pressure of a liquid by figure": (
        "senses: pressure, unit: mbar, density: 998.2072 kg/m3, mounted_at: 10 cm",
        250.0,
        2.65387,
    ),
    "pressure, absolute, under a given barometer": (
        "senses: pressure, unit: hPa, density: 998.2072 kg/m3, barometer: 1013.25 hPa",
        1263.25,
        2.55387,
    ),
    "pressure in water of 20 degC": (
        "senses: pressure, unit: mbar, medium: water, temperature: 20 degC",
        250.0,
        2.55387,
    ),
    "echo at 20 degC": ("senses: echo time, unit: ms, mounted_at: 2.5 m, temperature: 20 degC", 5.0, 1.64200),
    "echo at 32 degF": ("senses: echo time, unit: ms, mounted_at: 2.5 m, temperature: 32 degF", 5.0, 1.67179),
    "charge time by a current": (
        f"senses: charge time, unit: us, charging: {{current: 5.5 uA, to: 1.2 V}}, {LINE}",
        60.0,
        of_farad(275.0),
    ),
    "charge time through a resistor": (
        "senses: charge time, unit: us, charging: {resistor: 1 Mohm, supply: 3.3 V, from: 0.2 V, to: 2.0 V}, " + LINE,
        86.9038,
        of_farad(100.0),
    ),
    "charge voltage through a resistor": (
        "senses: charge voltage, charging: {resistor: 100 kohm, supply: 3.3 V, after: 47 us}, " + LINE,
        2.085998,
        of_farad(470.0),
    ),
    "charge voltage by a current": (
        "senses: charge voltage, charging: {current: 5.5 uA, after: 60 us}, " + LINE,
        1.2,
        of_farad(275.0),
    ),
    "admittance": (f"senses: admittance, unit: uS, excitation: 100 kHz, {LINE}", 62.831853, of_farad(100.0)),
    "impedance": (f"senses: admittance, unit: ohm, excitation: 100 kHz, {LINE}", 15915.4943, of_farad(100.0)),
    "admittance with a leak": (
        f"senses: admittance, unit: uS, excitation: 100 kHz, loss_angle: 9.0431 deg, {LINE}",
        63.622651,
        of_farad(100.0),
    ),
    "an oscillator known by a pair": (
        "senses: frequency, unit: kHz, oscillator: {at: 80.6 kHz, total: 84.4 pF, fixed: 22 pF, stray: 30 pF}, " + LINE,
        80.6 * 84.4 / 327,
        of_farad(275.0),
    ),
    "an oscillator known by its thresholds": (
        (
            "senses: frequency, unit: kHz, "
            "oscillator: {resistor: 100 kohm, supply: 5 V, upper: 3.0 V, lower: 2.2 V, stray: 30 pF}, " + LINE
        ),
        154.6486,
        of_farad(70.0),
    ),
    "a 555": (
        (
            "senses: frequency, oscillator: {charging: 10 kohm, discharging: 68 kohm}, "
            "calibration: {points: [[1 nF, 0 m], [10 nF, 1 m]]}"
        ),
        988.1473,
        1.0,
    ),
    "capacitance by dimensions": (
        (
            "senses: capacitance, unit: pF, "
            "probe: {form: coaxial, length: 1 m, rod: 6 mm, bore: 25 mm, permittivity: 80.2226}"
        ),
        38.9825 + 0.25 * (3127.276 - 38.982),
        0.25,
    ),
    "points through a curve": (
        "senses: capacitance, unit: pF, calibration: {points: [[100 pF, 0 m], [200 pF, 1 m], [300 pF, 2 m]]}",
        250.0,
        1.5,
    ),
    "points in least squares": (
        (
            "senses: capacitance, unit: pF, "
            "calibration: {fit: least squares, points: [[100 pF, 1 cm], [200 pF, 98 cm], [300 pF, 201 cm]]}"
        ),
        200.0,
        1.0,
    ),
}


@pytest.mark.parametrize("case", CASES)
def test_a_raw_value_reads_as_the_level_that_was_worked_out(case: str) -> None:
    """Within the digits of what was worked out."""
    sensor, raw, level = CASES[case]
    assert level_of(sensor, raw) == pytest.approx(level, abs=2e-4)


def test_what_is_felt_goes_into_the_level() -> None:
    """Water of 60 °C is lighter; a barometer that moves by 1 hPa is 10.2 mm of water; cold air slows the echo."""
    by_weight = "senses: pressure, unit: mbar, medium: water, temperature: warm, barometer: air"
    air = {"barometer": 101_325.0}
    assert level_of(by_weight, 1263.25, air | {"temperature": 333.15}) == pytest.approx(2.59286, abs=2e-5)
    before, after = (
        level_of(by_weight, 1263.25, {"barometer": pascal, "temperature": 293.15}) for pascal in (101_325.0, 101_425.0)
    )
    assert before - after == pytest.approx(0.0102155, abs=2e-7)
    echo = "senses: echo time, unit: ms, mounted_at: 2.5 m, temperature: warm"
    assert level_of(echo, 5.0, {"temperature": 273.15}) == pytest.approx(1.67179, abs=2e-5)


def test_a_bare_probe_is_compensated_for_the_waters_temperature() -> None:
    """Calibrated at 20 °C; at 50 °C the same level has less capacitance, by Malmberg and Maryott's permittivities."""
    sensor = (
        "senses: capacitance, unit: pF, calibration: {points: [[39 pF, 0 m], [3127 pF, 1 m]]},"
        " compensate: {with: warm, medium: water, at: 20 degC}"
    )
    cold, hot = 80.1030, 69.9093
    raw = 39 + 0.5 * 3088 * (hot - 1) / (cold - 1)
    assert level_of(sensor, raw, {"temperature": 323.15}) == pytest.approx(0.5, abs=1e-5)
    assert level_of(sensor, raw, {"temperature": 293.15}) == pytest.approx(0.5 * (hot - 1) / (cold - 1), abs=1e-5)
    assert math.isclose((hot - 1) / (cold - 1), 0.871, abs_tol=1e-3)
