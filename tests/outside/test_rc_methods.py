"""Circuits that tell a capacitance, against the formulas of the RC circuit and the data sheets of makers."""

import math

import pytest

from gateway.measure.calibration import Line
from gateway.measure.sensing import charge_time, charge_voltage
from gateway.measure.sensing.admittance import Admittance, Impedance
from gateway.measure.sensing.circuit import ByCapacitance, Circuit, Net
from gateway.measure.sensing.oscillator import Oscillator, known_pair, schmitt_trigger, timer_555

PICO = 1e-12

# A circuit, what it gives, and the capacitance in pF: worked out beforehand from C = I·t/V, v(t) = V∞ + (V0 -
# V∞)·exp(-t/RC) and Y = G + jωC (any text on electricity). Where a fraction x of the supply is charged to, the supply
# is 1 V.
CASES: dict[str, tuple[Circuit, float, float]] = {
    "constant current": (charge_time.ByCurrent(5.5e-6, 1.2), 20e-6, 91.66666666666667),
    "to 1 - 1/e": (charge_time.ThroughResistor(1e6, 1.0, 0.0, 1 - 1 / math.e), 100e-6, 100.0),
    "to 1/2": (charge_time.ThroughResistor(1e6, 1.0, 0.0, 0.5), 69.31471805599453e-6, 100.0),
    "to 2/3": (charge_time.ThroughResistor(1e6, 1.0, 0.0, 2 / 3), 109.86122886681097e-6, 100.0),
    "to 0.9": (charge_time.ThroughResistor(1e6, 1.0, 0.0, 0.9), 230.25850929940458e-6, 100.0),
    "from 0.2 V to 2.0 V": (charge_time.ThroughResistor(1e6, 3.3, 0.2, 2.0), 86.90378e-6, 100.0),
    "voltage after 47 us": (charge_voltage.ThroughResistor(100e3, 3.3, 47e-6), 2.08599784413424, 470.0),
    "voltage after 47 us, half": (charge_voltage.ThroughResistor(100e3, 3.3, 47e-6), 2.8533935653191778, 235.0),
    "voltage by a current": (charge_voltage.ByCurrent(5.5e-6, 20e-6), 1.2, 91.66666666666667),
    "admittance": (Admittance(100e3), 62.831853071795855e-6, 100.0),
    "impedance": (Impedance(Admittance(100e3)), 15915.494309189535, 100.0),
    "ideal trigger": (schmitt_trigger(100e3, 3.0, 2.0, 1.0), 72134.75204444818, 100.0),
    "HEF40106B": (schmitt_trigger(100e3, 5.0, 3.0, 2.2), 154648.62199470162, 100.0),
    "CD40106BM": (schmitt_trigger(100e3, 5.0, 3.6, 1.4), 52940.21433159741, 100.0),
    "2.9 V and 1.9 V": (schmitt_trigger(100e3, 5.0, 2.9, 1.9), 123103.95025272782, 100.0),
    "555": (timer_555(10e3, 68e3), 988.147288280112, 10e3),
}
# Thresholds at 5 V. Sources: HEF40106B data sheet, January 1995: 3.0 and 2.2 V; CD40106BM data sheet, February 1988:
# 3.6 and 1.4 V; 2.9 and 1.9 V, behind the often quoted f = 1.2/(RC), are from memory.


@pytest.mark.parametrize("case", CASES)
def test_a_circuit_tells_its_capacitance_and_back(case: str) -> None:
    """To 1e-9; the one with printed digits only, to those."""
    circuit, raw, picofarad = CASES[case]
    rel = 1e-6 if case == "from 0.2 V to 2.0 V" else 1e-9
    assert circuit.farad(raw) == pytest.approx(picofarad * PICO, rel=rel)
    assert circuit.raw(picofarad * PICO) == pytest.approx(raw, rel=rel)
    assert circuit.farad(circuit.raw(picofarad * PICO)) == pytest.approx(picofarad * PICO, rel=1e-9)


# R 100 kohm: k = 1/(K·R), of the same sources.
TRIGGERS = {
    (2 / 3, 1 / 3, 1.0): 1.386294,
    (3.0, 2.2, 5.0): 0.646627,
    (3.6, 1.4, 5.0): 1.888923,
    (2.9, 1.9, 5.0): 0.812322,
}


@pytest.mark.parametrize("volts", TRIGGERS)
def test_the_constant_of_a_trigger(volts: tuple[float, float, float]) -> None:
    """To the digits printed; between two makers of the same part it is three times apart."""
    upper, lower, supply = volts
    k = 1 / (schmitt_trigger(100e3, supply, upper, lower).constant * 100e3)
    assert k == pytest.approx(TRIGGERS[volts], abs=5e-7)


def test_the_timer_of_a_data_sheet() -> None:
    """ST NE555 data sheet, Doc ID 2182 Rev 6, p. 10: R1 10 kohm, R2 68 kohm, 10 nF: 986.3014 Hz, with 1.44 rounded."""
    assert timer_555(10e3, 68e3).raw(10e-9) == pytest.approx(986.3014, rel=2e-3)
    assert timer_555(10e3, 68e3).raw(10e-9) / 986.3013698630137 - 1 == pytest.approx(0.00187, abs=5e-6)


def test_a_voltage_comes_as_a_code_of_a_converter() -> None:
    """2.085998 V of 3.3 V is 2589 of 4095, rounded (worked out beforehand)."""
    assert round(charge_voltage.ThroughResistor(100e3, 3.3, 47e-6).raw(470e-12) / 3.3 * 4095) == 2589


def test_a_leak_does_not_count_where_the_phase_is_known() -> None:
    """100 pF beside 10 uS at 100 kHz: |Y| 63.622651 uS at 80.9569 degrees; all of |Y| would be 101.2586 pF."""
    seen = 63.62265131567328e-6
    phase = math.radians(80.9569)
    assert Admittance(100e3, phase).farad(seen) == pytest.approx(100e-12, rel=1e-6)
    assert Impedance(Admittance(100e3, phase)).farad(1 / seen) == pytest.approx(100e-12, rel=1e-6)
    assert Admittance(100e3).farad(seen) == pytest.approx(101.2586e-12, rel=1e-6)


def test_two_oscillator_readings_from_practice() -> None:
    """80.6 kHz with 84.4 pF in all, and 2.9 kHz immersed (common practice, no source).

    K = f·C of the first gives 2345.7 pF for the second, pure arithmetic; less 22 + 30 pF that is 'about 2 nF'.
    """
    oscillator = known_pair(80.6e3, 84.4e-12)
    assert oscillator.constant == pytest.approx(6.80264e-6, rel=1e-9)
    assert oscillator.farad(2.9e3) == pytest.approx(2345.7e-12, rel=1e-3)
    assert oscillator.farad(2.9e3) == pytest.approx(2345.7379310344827e-12, rel=1e-9)
    probe = Net(oscillator, 52e-12)
    assert probe.farad(80.6e3) == pytest.approx(32.4e-12, rel=1e-9)
    assert 1.5e-9 < probe.farad(2.9e3) < 2.5e-9
    assert probe.farad(2.9e3) == pytest.approx(2293.7379310344827e-12, rel=1e-9)
    assert probe.raw(probe.farad(2.9e3)) == pytest.approx(2.9e3, rel=1e-9)


def test_the_readings_resolve_no_better_than_their_digits() -> None:
    """2.9 kHz stands for 2.85 to 2.95 kHz: 2386.9 to 2306.0 pF (worked out beforehand)."""
    oscillator = known_pair(80.6e3, 84.4e-12)
    found = oscillator.farad(2.85e3), oscillator.farad(2.95e3)
    assert found == pytest.approx((2386.9e-12, 2306.0e-12), abs=5e-14)


def test_an_oscillator_reads_as_a_level() -> None:
    """Half of the capacitance is half of the level, whatever the frequency."""
    circuit = Net(known_pair(80.6e3, 84.4e-12), 52e-12)
    sensor = ByCapacitance(circuit, Line(32.4e-12, 0.05, 2293.7379310344827e-12, 1.95))
    assert sensor.convert(80.6e3).level == pytest.approx(0.05, abs=1e-9)
    assert sensor.convert(2.9e3).level == pytest.approx(1.95, abs=1e-9)
    assert sensor.convert(5598.6).level == pytest.approx(1.0, abs=1e-4)
    assert sensor.raw(1.0) == pytest.approx(5598.6, abs=0.1)


def test_constants_that_no_circuit_has_are_refused() -> None:
    """In words, when the circuit is made."""
    for constants in ((0.0, 1e-12), (80.6e3, -1e-12), (math.nan, 1e-12), (math.inf, 1e-12)):
        with pytest.raises(ValueError, match="must be more than nothing"):
            known_pair(*constants)
    for thresholds in ((2.0, 3.0), (5.0, 2.0), (3.0, 0.0)):
        with pytest.raises(ValueError, match="thresholds must be lower < upper"):
            schmitt_trigger(100e3, 5.0, *thresholds)
    for start, threshold in ((0.0, 3.3), (2.0, 1.0), (1.0, 1.0), (0.0, 4.0), (math.nan, 1.0)):
        with pytest.raises(ValueError, match="must lie between"):
            charge_time.ThroughResistor(1e6, 3.3, start, threshold)
    for phase in (0.0, 2.0, math.nan):
        with pytest.raises(ValueError, match="between 0 and 90 degrees"):
            Admittance(10e3, phase)
    with pytest.raises(ValueError, match="must be more than nothing"):
        Oscillator(0.0)
    with pytest.raises(ValueError, match="the charging resistor"):
        timer_555(-1.0, 68e3)


def test_discharging_is_charging_to_nothing() -> None:
    """From 3.0 to 1.5 V in 69.3147 us with 1 Mohm and 100 pF: R·C·ln(V0 / Vth), that is R·C·ln 2."""
    assert charge_time.ThroughResistor(1e6, 0.0, 3.0, 1.5).farad(69.31471805599453e-6) == pytest.approx(
        100e-12, rel=1e-9
    )
