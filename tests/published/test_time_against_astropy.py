"""Calendar, TDB and UTC against astropy (which computes them with the IAU's SOFA routines)."""

import datetime as dt

import numpy as np
import pytest
from astropy.time import Time, TimeDelta

from porkgrid.sky.epochs import (
    datetime64_from_jd,
    iso_from_jd,
    jd_from_date,
    jd_tdb_from_utc,
    tdb_minus_tt_s,
    utc_iso_from_jd_tdb,
)

RNG = np.random.default_rng(37)
DOUBLE_S = 45e-6  # the step of a Julian date in one double
TDB_S = 10e-6  # what the formula of TDB - TT claims; astropy has the long series for the geocentre


@pytest.mark.parametrize(
    "date", ["1549-12-31", "1600-02-29", "1900-03-01", "1969-07-20", "2000-02-29", "2649-12-31"]
)
def test_the_calendar_is_astropys(date):
    jd = Time(date, scale="tdb").jd
    assert jd_from_date(dt.date.fromisoformat(date)) == jd
    assert iso_from_jd(jd) == date


def test_datetime64_is_astropys():
    dates = RNG.uniform(2287184.5, 2688976.5, 300)
    expected = Time(dates, format="jd", scale="tdb").to_value("datetime64")
    off = np.abs((datetime64_from_jd(dates) - expected).astype("timedelta64[us]").astype(float))
    assert off.max() <= 500 + 1e6 * DOUBLE_S


@pytest.mark.filterwarnings("ignore:ERFA function:erfa.core.ErfaWarning")
def test_tdb_minus_tt_keeps_its_claim():
    dates = RNG.uniform(2305447.5, 2524593.5, 500)  # 1600 to 2200
    times = Time(2451545.0, dates - 2451545.0, format="jd", scale="tdb")
    tt = times.tt
    expected = ((times.jd1 - tt.jd1) + (times.jd2 - tt.jd2)) * 86400.0
    ours = np.array([tdb_minus_tt_s(jd) for jd in dates])
    assert np.abs(ours - expected).max() <= TDB_S


@pytest.mark.filterwarnings("ignore:ERFA function:erfa.core.ErfaWarning")
def test_utc_of_a_tdb_date_is_astropys_to_the_millisecond():
    for jd in RNG.uniform(2441320.0, 2488070.0, 300):  # 1972 to 2100
        expected = Time(jd, format="jd", scale="tdb").utc
        ours = Time(utc_iso_from_jd_tdb(jd), format="isot", scale="utc")
        assert abs((ours - expected).sec) <= 0.5e-3 + DOUBLE_S + TDB_S


@pytest.mark.filterwarnings("ignore:ERFA function:erfa.core.ErfaWarning")
def test_the_tdb_date_of_utc_is_astropys():
    for jd in RNG.uniform(2441320.0, 2488070.0, 300):
        utc = Time(jd, format="jd", scale="utc", precision=3).isot
        expected = Time(utc, scale="utc").tdb
        assert abs((Time(jd_tdb_from_utc(utc), format="jd", scale="tdb") - expected).sec) <= DOUBLE_S + TDB_S


def test_every_leap_second_is_astropys():
    # Either side of every midnight that begins a half year, which is where leap seconds have been put in.
    for year in range(1972, 2027):
        for day in (f"{year}-01-01", f"{year}-07-01"):
            midnight = Time(day, scale="utc")
            for off_s in (-1.75, -0.75, 0.25) if day != "1972-01-01" else (0.25,):
                instant = midnight + TimeDelta(off_s, format="sec")
                ours = utc_iso_from_jd_tdb(instant.tdb.jd)
                assert ours[:19] == instant.isot[:19], (day, off_s)
