"""Compiled reading of plain numbers in text tables, for long records.

The decimal digits of a number make a whole number up to 2^53 and a power of ten up to 10^22; both are exact
floats, so one multiplication or division rounds correctly (W. D. Clinger, How to read floating point numbers
accurately, 1990; memory). Whatever does not fit is refused, never approximated.
"""

from __future__ import annotations

# mypy: ignore-errors
# The types of compiled code are those numba infers.
import numpy as np
from numba import njit

POWERS = np.array([float(f"1e{k}") for k in range(23)])
ZEROS, ONE, TEN = np.uint64(0), np.uint64(1), np.uint64(10)
EXACT = np.uint64(1 << 53)
FOUR, DIGITS = np.uint64(4), np.uint64(18)  # more could overflow 64 bits
NEWLINE, RETURN, SPACE, QUOTE = np.uint8(10), np.uint8(13), np.uint8(32), np.uint8(34)
PLUS, MINUS, ZERO, NINE = np.uint8(43), np.uint8(45), np.uint8(48), np.uint8(9)
LOWER = np.uint8(32)  # turns an upper-case letter into a lower-case one
E, N, A = np.uint8(ord("e")), np.uint8(ord("n")), np.uint8(ord("a"))


@njit(nogil=True, cache=True, inline="always")
def _digits(data, i, whole):
    """Append the digits from ``i`` on to a whole number; return the place after them and the number."""
    while True:
        digit = np.uint8(data[i] - ZERO)
        if digit > NINE:
            return i, whole
        whole = whole * TEN + np.uint64(digit)
        i += ONE


@njit(nogil=True, cache=True, inline="always")
def _exponent(data, i):
    """Read "e-12" at ``i``; return the place after it, the power, and whether it is one."""
    i += ONE
    down = data[i] == MINUS
    if down or data[i] == PLUS:
        i += ONE
    begin = i
    i, power = _digits(data, i, ZEROS)
    return i, -np.int64(power) if down else np.int64(power), ONE <= i - begin <= FOUR


@njit(nogil=True, cache=True, inline="always")
def _number(data, i, decimal):
    """Read the number at ``i``; return the place after it, the number (NaN: missing), and whether it is exact."""
    negative = data[i] == MINUS
    signed = negative or data[i] == PLUS
    if signed:
        i += ONE
    begin = i
    i, whole = _digits(data, i, ZEROS)
    count, places = i - begin, ZEROS
    if data[i] == decimal:
        i += ONE
        begin = i
        i, whole = _digits(data, i, whole)
        places = i - begin
        count += places
    elif count == ZEROS and not signed:
        if (data[i] | LOWER) == N and (data[i + ONE] | LOWER) == A and (data[i + ONE + ONE] | LOWER) == N:
            i += ONE + ONE + ONE
        return i, np.nan, True
    exact = ONE <= count <= DIGITS and whole <= EXACT
    number = np.float64(np.int64(whole))
    if (data[i] | LOWER) == E:
        i, power, valid = _exponent(data, i)
        power -= np.int64(places)
        exact = exact and valid and -22 <= power <= 22
        if exact:
            number = number / POWERS[-power] if power < 0 else number * POWERS[power]
    elif exact:
        number = number / POWERS[places]
    return i, -number if negative else number, exact


@njit(nogil=True, cache=True)
def read_rows(data, delimiter, decimal, width, channel, time, values, times):
    """Read two columns of whole rows of ``width`` cells; ``data`` (uint8) ends with a line feed.

    Fills ``values`` and ``times`` (float64, NaN where a cell is empty) and returns the number of rows, or -1
    when anything stands there that needs care. ``time`` is -1 when there is no time column.
    """
    delimiter, decimal = np.uint8(delimiter), np.uint8(decimal)
    i, row, stop = ZEROS, ZEROS, np.uint64(data.size)
    while i < stop:
        for cell in range(width):
            if cell == channel or cell == time:  # noqa: SIM109 - the tuple would be built for every cell
                while data[i] == SPACE:
                    i += ONE
                i, number, exact = _number(data, i, decimal)
                if not exact:
                    return -1
                while data[i] == SPACE:
                    i += ONE
                if cell == channel:
                    values[row] = number
                else:
                    times[row] = number
            else:
                while data[i] != delimiter and data[i] != NEWLINE and data[i] != RETURN:
                    if data[i] == QUOTE:
                        return -1
                    i += ONE
            if cell == width - 1 and data[i] == RETURN:
                i += ONE
            if data[i] != (delimiter if cell < width - 1 else NEWLINE):
                return -1
            i += ONE
        row += ONE
    return np.int64(row)
