"""Times as RFC 3339 writes them: the examples of its section 5.8, and its rules in 5.6 and 5.7."""

from datetime import UTC, datetime, timedelta, timezone

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gateway.measure.payloads.own_time import FORMS, rfc_3339
from gateway.measure.payloads.payload import PayloadError

EPOCH = datetime(1970, 1, 1, tzinfo=UTC)

SECTION_5_8 = [
    ("1985-04-12T23:20:50.52Z", "1985-04-12T23:20:50.520000+00:00"),
    ("1996-12-19T16:39:57-08:00", "1996-12-20T00:39:57+00:00"),
    ("1990-12-31T23:59:60Z", "1991-01-01T00:00:00+00:00"),
    ("1990-12-31T15:59:60-08:00", "1991-01-01T00:00:00+00:00"),
    ("1985-04-12 23:20:50Z", "1985-04-12T23:20:50+00:00"),  # the note in 5.6 lets applications take a blank
    ("1985-04-12t23:20:50z", "1985-04-12T23:20:50+00:00"),  # lower case is permitted by the grammar
]


@pytest.mark.parametrize(("text", "instant"), SECTION_5_8)
def test_a_time_is_the_instant_that_the_standard_says(text: str, instant: str) -> None:
    """A leap second counts as the second after it."""
    assert rfc_3339(text) == round(datetime.fromisoformat(instant).timestamp() * 1e6) * 1000


@pytest.mark.parametrize(
    "text",
    [
        "1985-04-12T23:20:50.52",  # no offset
        "1985-4-12T23:20:50Z",
        "1985-02-29T00:00:00Z",  # no leap year
        "1985-04-12T24:00:00Z",
        "1985-04-12T23:20:50+0800",  # the colon is missing
        "1985-04-12T23:20Z",
        "1985-04-12T23:20:61Z",
        "1985-04-12T23:20:50+24:00",
        "1937-01-01T12:00:27.87+00:20",  # right by the standard, and before 1970
        "٢٠٢٦-05-01T00:00:00Z",
        "",
        "9" * 10_000,
    ],
)
def test_what_is_no_time_is_refused(text: str) -> None:
    """With a reason."""
    with pytest.raises(PayloadError):
        rfc_3339(text)


@given(st.datetimes(datetime(1970, 1, 2), datetime(2200, 1, 1)), st.integers(-1439, 1439))  # noqa: DTZ001 - the zone is added
def test_any_time_in_any_zone_is_the_instant_of_the_standard_library(moment: datetime, minutes: int) -> None:
    """Source: Python's datetime."""
    text = moment.replace(tzinfo=timezone(timedelta(minutes=minutes))).isoformat()
    assert rfc_3339(text) == (datetime.fromisoformat(text) - EPOCH) // timedelta(microseconds=1) * 1000


def test_the_other_forms_are_plain_counts_since_1970() -> None:
    """Seconds, with fractions, and milliseconds."""
    assert FORMS["unix s"](1_276_020_076.001) == pytest.approx(1_276_020_076_001_000_000, abs=500)
    assert FORMS["unix ms"](1_276_020_076_001) == pytest.approx(1_276_020_076_001_000_000, abs=500)
    for form in ("unix s", "unix ms"):
        for value in (-1, 1e300, True, "1", None):
            with pytest.raises(PayloadError):
                FORMS[form](value)
