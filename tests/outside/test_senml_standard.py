"""The examples of RFC 8428 (SenML), sections 5.1.1 to 5.1.6, and its rules on versions and unknown fields."""

import json

import pytest

from gateway.measure.payloads.payload import PayloadError, document_of
from gateway.measure.payloads.senml import newest, resolve

DEVICE = "urn:dev:ow:10e2073a0108006:"
SECTION_5_1_2 = [
    {"bn": DEVICE, "bt": 1.276020076001e09, "bu": "A", "bver": 5, "n": "voltage", "u": "V", "v": 120.1},
    {"n": "current", "t": -5, "v": 1.2},
    {"n": "current", "t": -4, "v": 1.3},
    {"n": "current", "t": -3, "v": 1.4},
    {"n": "current", "t": -2, "v": 1.5},
    {"n": "current", "t": -1, "v": 1.6},
    {"n": "current", "v": 1.7},
]
RESOLVED_5_1_2 = [
    ("current", "A", 1.2, 1276020071.001),
    ("current", "A", 1.3, 1276020072.001),
    ("current", "A", 1.4, 1276020073.001),
    ("current", "A", 1.5, 1276020074.001),
    ("current", "A", 1.6, 1276020075.001),
    ("voltage", "V", 120.1, 1276020076.001),
    ("current", "A", 1.7, 1276020076.001),
]
SECTION_5_1_6 = [
    {"bn": "2001:db8::2/", "bt": 1.320078429e09, "n": "temperature", "u": "Cel", "v": 25.2},
    {"n": "humidity", "u": "%RH", "v": 30},
    {"bn": "2001:db8::1/", "n": "temperature", "u": "Cel", "v": 12.3},
    {"n": "humidity", "u": "%RH", "v": 67},
]


def test_section_5_1_1_a_single_record_is_of_now() -> None:
    """Time 0, no bases."""
    records = resolve([{"n": "urn:dev:ow:10e2073a01080063", "u": "Cel", "v": 23.1}])
    assert records == [("urn:dev:ow:10e2073a01080063", "Cel", 23.1, 0.0)]
    assert records[0].is_relative


def test_section_5_1_2_bases_stand_for_all_that_follow() -> None:
    """In the order of time, as the resolved form is."""
    records = resolve(document_of(json.dumps(SECTION_5_1_2).encode()))
    assert [one[:3] for one in records] == [(DEVICE + name, unit, value) for name, unit, value, _ in RESOLVED_5_1_2]
    assert [one.time for one in records] == pytest.approx([time for *_, time in RESOLVED_5_1_2], abs=1e-6)
    assert newest(records, DEVICE + "current").value == 1.7
    assert not records[0].is_relative


def test_section_5_1_6_a_base_name_in_the_middle_keeps_the_base_time() -> None:
    """The second device's records are of the same time."""
    records = resolve(SECTION_5_1_6)
    assert [(one.name, one.value, one.time) for one in records] == [
        ("2001:db8::2/temperature", 25.2, 1320078429.0),
        ("2001:db8::2/humidity", 30, 1320078429.0),
        ("2001:db8::1/temperature", 12.3, 1320078429.0),
        ("2001:db8::1/humidity", 67, 1320078429.0),
    ]


def test_section_4_5_3_a_time_below_2_to_the_28_is_relative_to_now() -> None:
    """2^28 s are 1978-07-04T21:24:16Z."""
    below, at = resolve([{"n": "a", "v": 1, "t": 2**28 - 1}, {"n": "a", "v": 2, "t": 2**28}])
    assert (below.is_relative, at.is_relative) == (True, False)


def test_a_base_value_is_added() -> None:
    """Section 4.1: value = base value + value."""
    assert [one.value for one in resolve([{"bv": 20, "n": "a", "v": 1.5}, {"n": "a", "v": 2, "t": 1}])] == [21.5, 22]


@pytest.mark.parametrize(
    ("pack", "said"),
    [
        ([{"bver": 11, "n": "a", "v": 1}], "SenML version 11"),
        ([{"n": "a", "v": 1, "new_": 1}], "must be understood"),
        ({"n": "a", "v": 1}, "no SenML pack"),
        ([1], "no SenML pack"),
        ([{"n": "a", "v": "1"}], "a string where a number belongs"),
        ([{"n": "a", "v": True}], "true or false where a number belongs"),
        ([{"n": 1, "v": 1}], "no text"),
        ([{"n": "a", "v": 1, "t": "now"}], "a string where a number belongs"),
        ([{"n": "b", "v": 1}], "there is no 'a' in the pack"),
        ([{"n": "a", "vs": "high"}], "there is no 'a' in the pack"),
        ([], "there is no 'a' in the pack"),
    ],
)
def test_a_pack_that_cannot_be_used_says_why(pack: object, said: str) -> None:
    """Section 4.4: versions and fields that must be understood."""
    with pytest.raises(PayloadError, match=said):
        newest(resolve(pack), "a")
