"""Stand-ins for the integrals, importable by worker processes: known values, no compiler, and a trace of every call."""

from __future__ import annotations

import math
import os
import time
from collections.abc import Mapping
from typing import Any

from kn_integrate import Estimate, PoleError, Status


def beta(integral: Mapping[str, Any], place: Any, options: Mapping[str, Any]) -> Estimate:
    """The four-point integral by Gamma functions, in double precision."""
    s, t = float(place.pair(1, 2)), float(place.pair(2, 3))
    for channel, x in (((1, 2), s), ((2, 3), t)):
        if x <= 0 and x == int(x):
            raise PoleError(channel, -int(x), x)
    value = math.gamma(s) * math.gamma(t) / math.gamma(s + t)
    return Estimate(value, 1e-14 * abs(value), Status.OK, "quadrature", 7)


def traced_beta(integral: Mapping[str, Any], place: Any, options: Mapping[str, Any]) -> Estimate:
    """The same, slowly, with one line for every call in the file that KN_TRACE names."""
    time.sleep(0.005)
    handle = os.open(os.environ["KN_TRACE"], os.O_WRONLY | os.O_APPEND | os.O_CREAT)
    os.write(handle, f"{place.pair(1, 2)}\n".encode())
    os.close(handle)
    return beta(integral, place, options)


def slow_beta(integral: Mapping[str, Any], place: Any, options: Mapping[str, Any]) -> Estimate:
    """The same, slow enough to be interrupted."""
    time.sleep(0.05)
    return beta(integral, place, options)


def killed_once(integral: Mapping[str, Any], place: Any, options: Mapping[str, Any]) -> Estimate:
    """The same, but the first worker that comes to the point s = 1/2 dies there."""
    if str(place.pair(1, 2)) == "1/2":
        try:
            handle = os.open(os.environ["KN_TRACE"], os.O_WRONLY | os.O_CREAT | os.O_EXCL)
        except FileExistsError:
            return beta(integral, place, options)
        os.close(handle)
        os.kill(os.getpid(), 9)
    return beta(integral, place, options)


def slips(integral: Mapping[str, Any], place: Any, options: Mapping[str, Any]) -> Estimate:
    """The same, with a slip at s = 1/2."""
    if str(place.pair(1, 2)) == "1/2":
        raise ZeroDivisionError("a slip at 1/2")
    return beta(integral, place, options)
