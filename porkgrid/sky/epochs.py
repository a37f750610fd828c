"""Turn calendar dates into Julian dates and back, in TDB and in UTC.

Epochs inside porkgrid are TDB Julian dates held in one double, which is good to about 20 microseconds.
The calendar is Gregorian throughout, also before 1582.
"""

from __future__ import annotations

import bisect
import datetime as dt
import math
import re

import numpy as np
from numpy.typing import ArrayLike, NDArray

from porkgrid.errors import RequestError
from porkgrid.physics.constants import DAY_S, J2000_JD, JULIAN_CENTURY_DAYS

_DAY_MS = 86_400_000
_UNIX_EPOCH_JD = 2_440_587.5
_JD_OF_ORDINAL_ZERO = 1_721_424.5  # date.toordinal() counts days from 0001-01-01 = 1
_TT_MINUS_TAI_MS = 32_184  # IAU 1991, exact

# The days on which TAI - UTC changed, with its value in seconds from then on (IERS Bulletin C; no further
# leap second had been announced when this was written, and later dates keep the last value).
_LEAP_SECONDS = (
    ("1972-01-01", 10), ("1972-07-01", 11), ("1973-01-01", 12), ("1974-01-01", 13), ("1975-01-01", 14),
    ("1976-01-01", 15), ("1977-01-01", 16), ("1978-01-01", 17), ("1979-01-01", 18), ("1980-01-01", 19),
    ("1981-07-01", 20), ("1982-07-01", 21), ("1983-07-01", 22), ("1985-07-01", 23), ("1988-01-01", 24),
    ("1990-01-01", 25), ("1991-01-01", 26), ("1992-07-01", 27), ("1993-07-01", 28), ("1994-07-01", 29),
    ("1996-01-01", 30), ("1997-07-01", 31), ("1999-01-01", 32), ("2006-01-01", 33), ("2009-01-01", 34),
    ("2012-07-01", 35), ("2015-07-01", 36), ("2017-01-01", 37),
)  # fmt: skip
_LEAP_DAYS = [dt.date.fromisoformat(day).toordinal() for day, _ in _LEAP_SECONDS]
_UNIX_ORDINAL = dt.date(1970, 1, 1).toordinal()

_UTC_TEXT = re.compile(r"(\d{4}-\d\d-\d\d)(?:[T ](\d\d):(\d\d)(?::(\d\d(?:\.\d+)?))?)?Z?")


def jd_from_date(date: dt.date | dt.datetime) -> float:
    """Return the Julian date of a calendar date (its midnight) or of a date with a time, same time scale.

    A datetime with a zone is refused with ValueError: porkgrid's calendar is TDB, which has none.
    """
    jd = date.toordinal() + _JD_OF_ORDINAL_ZERO
    if not isinstance(date, dt.datetime):
        return jd
    if date.tzinfo is not None:
        raise ValueError(f"{date.isoformat()} has a time zone; dates are TDB, so write it without one")
    of_day = date - dt.datetime(date.year, date.month, date.day)
    return jd + of_day / dt.timedelta(days=1)


def datetime64_from_jd(jd: ArrayLike) -> NDArray[np.datetime64]:
    """Return datetime64[ms] of Julian dates of any shape, same time scale; NaN becomes NaT."""
    since_unix_ms = np.rint((np.asarray(jd, dtype=float) - _UNIX_EPOCH_JD) * _DAY_MS)
    known = np.isfinite(since_unix_ms)
    stamps = np.where(known, since_unix_ms, 0.0).astype(np.int64).astype("datetime64[ms]")
    return np.where(known, stamps, np.datetime64("NaT", "ms"))


def iso_from_jd(jd: float) -> str:
    """Write a Julian date as a calendar date to the second, same time scale.

    Midnight is "2028-11-30", a full minute "2028-11-30T12:00", anything else "2028-11-30T12:00:30".
    """
    second = math.floor((float(jd) - _UNIX_EPOCH_JD) * DAY_S + 0.5)
    text = str(np.datetime64(second, "s"))
    return text.removesuffix(":00").removesuffix("T00:00")


def tdb_minus_tt_s(jd_tdb: float) -> float:
    """Return TDB - TT in seconds, to 10 microseconds between 1600 and 2200.

    USNO Circular 179 (Kaplan 2005), equation 2.6 (memory).
    """
    t = (jd_tdb - J2000_JD) / JULIAN_CENTURY_DAYS
    return (
        0.001657 * math.sin(628.3076 * t + 6.2401)
        + 0.000022 * math.sin(575.3385 * t + 4.2970)
        + 0.000014 * math.sin(1256.6152 * t + 6.1969)
        + 0.000005 * math.sin(606.9777 * t + 4.0212)
        + 0.000005 * math.sin(52.9691 * t + 0.4444)
        + 0.000002 * math.sin(21.3299 * t + 5.5431)
        + 0.000010 * t * math.sin(628.3076 * t + 4.2490)
    )


def utc_iso_from_jd_tdb(jd_tdb: float) -> str:
    """Write a TDB Julian date as UTC to the millisecond, "2028-11-30T11:58:50.816", second 60 included.

    Raises RequestError before 1972, when UTC did not yet run in whole seconds from TAI.
    """
    since_unix_s = (float(jd_tdb) - _UNIX_EPOCH_JD) * DAY_S - tdb_minus_tt_s(float(jd_tdb))
    tai_ms = round(since_unix_s * 1000.0) - _TT_MINUS_TAI_MS
    for day, (_, count) in zip(reversed(_LEAP_DAYS), reversed(_LEAP_SECONDS), strict=True):
        utc_ms = tai_ms - count * 1000
        midnight_ms = (day - _UNIX_ORDINAL) * _DAY_MS
        if utc_ms >= midnight_ms:
            return str(np.datetime64(utc_ms, "ms"))
        if utc_ms >= midnight_ms - 1000 and day != _LEAP_DAYS[0]:  # inside the second that was put in
            return str(np.datetime64(utc_ms, "ms")).replace("T23:59:59", "T23:59:60")
    raise RequestError(_before_1972(iso_from_jd(jd_tdb)))


def jd_tdb_from_utc(utc: str | dt.date) -> float:
    """Return the TDB Julian date of a UTC instant: ISO text, a date, or a datetime (UTC if it has no zone).

    ISO text may name second 60 where a leap second was put in. Raises RequestError for text that is no
    such date and for dates before 1972.
    """
    if isinstance(utc, dt.datetime) and utc.tzinfo is not None:
        utc = utc.astimezone(dt.UTC).replace(tzinfo=None)
    text = utc if isinstance(utc, str) else utc.isoformat()
    day, second_of_day = _split_utc(text)
    if day < _LEAP_DAYS[0]:
        raise RequestError(_before_1972(text))
    count = _LEAP_SECONDS[bisect.bisect_right(_LEAP_DAYS, day) - 1][1]
    tt_s = second_of_day + count + _TT_MINUS_TAI_MS / 1000.0
    midnight_jd = day + _JD_OF_ORDINAL_ZERO
    return midnight_jd + (tt_s + tdb_minus_tt_s(midnight_jd + tt_s / DAY_S)) / DAY_S


def _split_utc(text: str) -> tuple[int, float]:
    """Return the ordinal day and the second of the day of ISO text."""
    match = _UTC_TEXT.fullmatch(text)
    try:
        if match is None:
            raise ValueError
        date, hour, minute, second = match.groups(default="0")
        day = dt.date.fromisoformat(date).toordinal()
    except ValueError:
        raise RequestError(f"{text!r} is not a UTC date such as 2028-11-30T12:00:00") from None
    second_of_day = 3600 * int(hour) + 60 * int(minute) + float(second)
    leap_here = (hour, minute) == ("23", "59") and day + 1 in _LEAP_DAYS[1:]
    if int(hour) > 23 or int(minute) > 59 or float(second) >= (61 if leap_here else 60):
        raise RequestError(f"{text!r} has no such time of day; no leap second was put in there")
    return day, second_of_day


def _before_1972(date: str) -> str:
    return f"{date} is before 1972-01-01, where UTC in whole seconds begins; give a later date"
