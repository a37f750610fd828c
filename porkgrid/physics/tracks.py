"""Paths of attracting bodies as Chebyshev pieces, cheap to look up inside an integration.

All pieces have one length and one number of terms, so that a single set of polynomials T_k serves every body
at a time. Positions (3,) km from one centre, velocities km/s, accelerations km/s², times s from an epoch of
the caller's.

Source: Press and others, Numerical Recipes, section 5.8 (memory).
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.polynomial import chebyshev
from numpy.typing import NDArray

from porkgrid.physics.timeflight import PLAIN

Floats = NDArray[np.float64]


class Tracks(NamedTuple):
    """Where b bodies are from `start_s` on: pieces of `piece_s`, coefficients (pieces, b, 3, terms) in km."""

    start_s: float
    piece_s: float
    coefficients: Floats


def sample_times(start_s: float, end_s: float, longest_piece_s: float, terms: int) -> Floats:
    """Times (pieces, terms) s at which `fit_tracks` wants positions: the Chebyshev nodes of every piece."""
    pieces = max(1, int(np.ceil((end_s - start_s) / longest_piece_s)))
    edges = np.linspace(start_s, end_s, pieces + 1)
    half = 0.5 * (end_s - start_s) / pieces
    return 0.5 * (edges[:-1] + edges[1:])[:, None] + half * chebyshev.chebpts1(terms)


def fit_tracks(start_s: float, end_s: float, times_s: Floats, positions: Floats) -> Tracks:
    """Pieces through positions (b, 3, pieces, terms) km at times (pieces, terms) s near `sample_times`.

    The times may be off the nodes by what the caller's calendar rounds: each piece is the polynomial through
    the samples at the times they are for.
    """
    pieces, terms = times_s.shape
    piece_s = (end_s - start_s) / pieces
    middles = start_s + (np.arange(pieces) + 0.5) * piece_s
    x = (times_s - middles[:, None]) / (0.5 * piece_s)
    values = np.moveaxis(positions, 2, 0).reshape(pieces, -1, terms)
    coefficients = np.linalg.solve(chebyshev.chebvander(x, terms - 1), np.swapaxes(values, 1, 2))
    shape = (pieces, positions.shape[0], positions.shape[1], terms)
    return Tracks(start_s, piece_s, np.ascontiguousarray(np.swapaxes(coefficients, 1, 2)).reshape(shape))


def state_on_track(tracks: Tracks, body: int, t_s: float) -> tuple[Floats, Floats, Floats]:
    """Position km, velocity km/s and acceleration km/s² of one body, (3,) each."""
    piece, x = locate(t_s, tracks.start_s, tracks.piece_s, tracks.coefficients.shape[0])
    rows = tracks.coefficients[piece, body].T
    rate = 2.0 / tracks.piece_s
    first, second = chebyshev.chebder(rows), chebyshev.chebder(rows, 2)
    return (
        chebyshev.chebval(x, rows),
        rate * chebyshev.chebval(x, first),
        rate * rate * chebyshev.chebval(x, second),
    )


@njit(**PLAIN)
def locate(t, start, length, pieces):
    """The piece that holds a time, and where in it the time lies, −1 to 1; the end pieces reach on."""
    piece = min(max(int((t - start) / length), 0), pieces - 1)
    return piece, 2.0 * (t - (start + (piece + 0.5) * length)) / length


@njit(**PLAIN)
def fill_positions(t, start, length, coefficients, out):
    """Positions of all bodies at a time, into out (b, 3)."""
    pieces, bodies, _, terms = coefficients.shape
    piece, x = locate(t, start, length, pieces)
    polynomial = np.empty(terms)
    polynomial[0], polynomial[1] = 1.0, x
    for k in range(2, terms):
        polynomial[k] = 2.0 * x * polynomial[k - 1] - polynomial[k - 2]
    for b in range(bodies):
        for i in range(3):
            total = 0.0
            for k in range(terms - 1, -1, -1):  # the small terms first
                total += coefficients[piece, b, i, k] * polynomial[k]
            out[b, i] = total


@njit(**PLAIN)
def fill_acceleration(t, start, length, coefficients, body, out):
    """Acceleration of one body at a time, into out (3,)."""
    pieces, _, _, terms = coefficients.shape
    piece, x = locate(t, start, length, pieces)
    rate2 = 4.0 / (length * length)
    out[:] = 0.0
    # T_k and its first two derivatives by x, each by the recurrence of T_k
    last, now, last1, now1, last2, now2 = 1.0, x, 0.0, 1.0, 0.0, 0.0
    for k in range(2, terms):
        last2, now2 = now2, 4.0 * now1 + 2.0 * x * now2 - last2
        last1, now1 = now1, 2.0 * now + 2.0 * x * now1 - last1
        last, now = now, 2.0 * x * now - last
        for i in range(3):
            out[i] += rate2 * coefficients[piece, body, i, k] * now2
