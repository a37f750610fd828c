"""Calendar dates, Julian dates, TDB and UTC."""

import datetime as dt

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from porkgrid.errors import RequestError
from porkgrid.sky.epochs import (
    datetime64_from_jd,
    iso_from_jd,
    jd_from_date,
    jd_tdb_from_utc,
    utc_iso_from_jd_tdb,
)


def test_dates_of_the_textbooks_have_their_julian_dates():
    # Meeus, Astronomical Algorithms, chapter 7 (memory): launch of Sputnik 1, and J2000.
    assert jd_from_date(dt.datetime(1957, 10, 4, 19, 26, 24)) == pytest.approx(2436116.31, abs=1e-8)
    assert jd_from_date(dt.datetime(2000, 1, 1, 12)) == 2451545.0
    assert jd_from_date(dt.date(1999, 1, 1)) == 2451179.5


@given(st.dates())
def test_a_date_comes_back_as_it_went_in(date):
    assert iso_from_jd(jd_from_date(date)) == date.isoformat()
    assert datetime64_from_jd(jd_from_date(date)) == np.datetime64(date, "ms")


@given(st.datetimes(dt.datetime(1600, 1, 1), dt.datetime(2600, 1, 1)))
def test_a_date_with_a_time_comes_back_to_the_second(moment):
    moment = moment.replace(microsecond=0)
    assert dt.datetime.fromisoformat(iso_from_jd(jd_from_date(moment))) == moment


def test_a_date_is_written_no_longer_than_it_needs():
    assert iso_from_jd(2462105.5) == "2028-11-30"
    assert iso_from_jd(2462106.0) == "2028-11-30T12:00"
    assert iso_from_jd(2462106.0 + 7 / 86400) == "2028-11-30T12:00:07"
    assert iso_from_jd(2462105.5 - 0.4 / 86400) == "2028-11-30"


def test_a_datetime_with_a_zone_is_refused():
    with pytest.raises(ValueError, match="time zone"):
        jd_from_date(dt.datetime(2028, 1, 1, tzinfo=dt.UTC))


def test_dates_of_any_shape_become_datetime64_and_nan_becomes_not_a_time():
    stamps = datetime64_from_jd(np.array([[2451545.0, np.nan], [2451544.5, 2451545.25]]))
    assert stamps.dtype == np.dtype("datetime64[ms]")
    assert stamps[0, 0] == np.datetime64("2000-01-01T12:00")
    assert np.isnat(stamps[0, 1])
    assert stamps[1, 1] == np.datetime64("2000-01-01T18:00")


@given(st.floats(2441318.0, 2500000.0))
def test_utc_text_returns_to_its_julian_date(jd_tdb):
    # Half a millisecond of the text and 20 microseconds of the double.
    assert jd_tdb_from_utc(utc_iso_from_jd_tdb(jd_tdb)) == pytest.approx(jd_tdb, abs=0.55e-3 / 86400)


def test_utc_is_written_through_a_leap_second():
    # 2016-12-31 had a second 60 (IERS Bulletin C 52); TAI - UTC 36 s before, 37 s after.
    start = jd_tdb_from_utc("2016-12-31T23:59:59.5")
    texts = [utc_iso_from_jd_tdb(start + step / 86400) for step in (0.0, 0.5, 1.0, 1.5)]
    shown = [text[:-4] for text in texts]
    assert shown == [
        "2016-12-31T23:59:59",
        "2016-12-31T23:59:60",
        "2016-12-31T23:59:60",
        "2017-01-01T00:00:00",
    ]


def test_second_sixty_is_one_second_after_second_fiftynine():
    before, leap = jd_tdb_from_utc("2016-12-31T23:59:59"), jd_tdb_from_utc("2016-12-31T23:59:60")
    after = jd_tdb_from_utc("2017-01-01")
    assert (leap - before) * 86400 == pytest.approx(1.0, abs=1e-4)
    assert (after - leap) * 86400 == pytest.approx(1.0, abs=1e-4)


def test_utc_comes_as_text_as_date_or_as_datetime_with_or_without_a_zone():
    expected = jd_tdb_from_utc("1974-02-05T17:01:00")
    assert jd_tdb_from_utc("1974-02-05 17:01") == expected
    assert jd_tdb_from_utc("1974-02-05T17:01:00Z") == expected
    assert jd_tdb_from_utc(dt.datetime(1974, 2, 5, 17, 1)) == expected
    east = dt.timezone(dt.timedelta(hours=2))
    assert jd_tdb_from_utc(dt.datetime(1974, 2, 5, 19, 1, tzinfo=east)) == expected
    assert jd_tdb_from_utc(dt.date(1974, 2, 5)) == jd_tdb_from_utc("1974-02-05")


@pytest.mark.parametrize(
    "text",
    [
        "2028-13-01",
        "2028-02-30T00:00",
        "yesterday",
        "2028-01-01T24:00",
        "2028-01-01T10:60",
        "2028-06-30T23:59:60",
        "2016-12-31T23:58:60",
    ],
)
def test_text_that_is_no_utc_date_is_refused(text):
    with pytest.raises(RequestError, match=text[:10]):
        jd_tdb_from_utc(text)


def test_utc_before_its_leap_seconds_is_refused_both_ways():
    with pytest.raises(RequestError, match="1972-01-01"):
        jd_tdb_from_utc("1971-12-31")
    with pytest.raises(RequestError, match="1972-01-01"):
        utc_iso_from_jd_tdb(jd_from_date(dt.date(1964, 11, 28)))
    first_instant = jd_tdb_from_utc("1972-01-01")
    assert utc_iso_from_jd_tdb(first_instant + 1e-8).startswith("1972-01-01T00:00:00.00")
    with pytest.raises(RequestError, match="1972-01-01"):
        utc_iso_from_jd_tdb(first_instant - 0.5 / 86400)
