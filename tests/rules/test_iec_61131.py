"""The standard blocks of IEC 61131-3 expressed in conditions and rules.

Source: IEC 61131-3, standard function blocks and annex examples, from memory of the standard; the vectors are worked
out from those rules. PT = 4 s for the timers, one evaluation a second, one character a second from t = 0.
"""

import pytest
from sentences import Trial

from rules.model import OnUnknown, Rank
from rules.rule import Side, verdicts
from rules.truth import FALSE, TRUE

ON = {"1": TRUE, "0": FALSE}


def answers(text: str, signal: str) -> str:
    """Return a condition's truth each second, as the standard's tables write it."""
    trial = Trial(text)
    trial.put("a", FALSE)
    trial.at(0)
    told = []
    for second, letter in enumerate(signal):
        trial.put("a", ON[letter])
        told.append("1" if trial.at(second + 100) == TRUE else "0")
    return "".join(told)


def test_ton_is_for() -> None:
    """TON: the output rises PT after the input rose and falls with it."""
    assert answers("a is yes for 4 s", "01111110011001111111000000") == "00000110000000000111000000"


def test_tof_is_not_of_for_of_not() -> None:
    """TOF: the output follows the input up at once and falls PT after it fell."""
    assert answers("not ((not a is yes) for 4 s)", "01110000001100110000000000") == "01111111001111111111000000"


def test_debounce_is_two_delays_and_a_latch() -> None:
    """DEBOUNCE, PT = 3 s: DB_ON, DB_OFF and an SR between them, which is a rule with `from` and `until`."""
    signal = "001001111101000011111111"
    rises, falls = answers("a is yes for 3 s", signal), answers("(not a is yes) for 3 s", signal)
    table = verdicts(Rank.TRIP, OnUnknown.HOLD)
    out, told = False, ""
    for rise, fall in zip(rises, falls, strict=True):
        out = table[_side(rise), _side(fall), out, OnUnknown.HOLD]
        told += str(int(out))
    assert told == "000000001111111000011111"


def _side(letter: str) -> Side:
    return Side.TRUE if letter == "1" else Side.FALSE


# set, reset, Q1 before → SR after, RS after.
BISTABLES = [
    (0, 0, 0, 0, 0), (0, 0, 1, 1, 1), (0, 1, 0, 0, 0), (0, 1, 1, 0, 0),
    (1, 0, 0, 1, 1), (1, 0, 1, 1, 1), (1, 1, 0, 1, 0), (1, 1, 1, 1, 0),
]  # fmt: skip


@pytest.mark.parametrize(("set_", "reset", "before", "sr", "rs"), BISTABLES)
def test_a_trip_is_an_sr_and_an_auto_rule_an_rs(set_: int, reset: int, before: int, sr: int, rs: int) -> None:
    """SR: Q1 := S1 or (not R and Q1). RS: Q1 := not R1 and (S or Q1)."""
    key = (_side(str(set_)), _side(str(reset)), bool(before), OnUnknown.HOLD)
    assert verdicts(Rank.TRIP, OnUnknown.HOLD)[key] == bool(sr)
    assert verdicts(Rank.AUTO, OnUnknown.RELEASE)[key] == bool(rs)


def test_hysteresis_has_both_comparisons_strict() -> None:
    """HYSTERESIS, XIN2 = 50, EPS = 5: `from: x above 55 m`, `until: x below 45 m`."""
    values = [50, 54, 55, 55.1, 60, 50, 45, 44.9, 45, 55, 55.1]
    expected = [0, 0, 0, 1, 1, 1, 1, 0, 0, 0, 1]
    assert _band("x above 55 m", "x below 45 m", values) == expected


def test_limits_alarm_is_two_such_rules() -> None:
    """LIMITS_ALARM, H = 80, L = 20, EPS = 5: sets at X > H, clears at X < H - EPS; and the mirror image at L."""
    high = _band("x above 80 m", "x below 75 m", [80, 80.1, 75, 74.9])
    low = _band("x below 20 m", "x above 25 m", [20, 19.9, 25, 25.1])
    assert (high, low) == ([0, 1, 1, 0], [0, 1, 1, 0])


def _band(from_: str, until: str, values: list[float]) -> list[int]:
    table = verdicts(Rank.AUTO, OnUnknown.RELEASE)
    on, off = Trial(from_), Trial(until)
    state, told = False, []
    for second, value in enumerate(values):
        for trial in (on, off):
            trial.put("x", value=float(value))
        state = table[Side(on.at(second)), Side(off.at(second)), state, OnUnknown.RELEASE]
        told.append(int(state))
    return told
