"""Branch-free logarithm, exponential, arctangent and sine/cosine that the compiler can vectorise.

The library functions are calls, and a loop that calls is not vectorised; these are plain arithmetic on the bits of
the double, so a loop over an array of them becomes one over vector registers.  Polynomials and range reductions are
the classical ones (argument split ``x = 2^k m``, ``log m = 2 artanh((m-1)/(m+1))``; Cody-Waite reduction for the
exponential and the trigonometric functions; common practice).  Coefficients are Taylor coefficients, or Chebyshev fits
made with ``mpmath.chebyfit`` on the reduced range; tests measure the error in units in the last place.

Domains: ``log`` needs a positive normal number, ``exp`` clamps its argument to +-708, ``atan`` takes any
non-negative quotient as numerator and positive denominator, ``sincos`` moduli below about 1e5.  Nothing is checked.
"""

from __future__ import annotations

from typing import Any

from llvmlite import ir
from numba import njit, types
from numba.extending import intrinsic


@intrinsic
def _bits(typingctx: Any, value: Any) -> Any:
    """The 64 bits of a double as a signed integer."""

    def codegen(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        return builder.bitcast(args[0], ir.IntType(64))

    return types.int64(types.float64), codegen


@intrinsic
def _double(typingctx: Any, value: Any) -> Any:
    """The double with these 64 bits."""

    def codegen(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        return builder.bitcast(args[0], ir.DoubleType())

    return types.float64(types.int64), codegen


_LN2_HI = 0.6931471803691238  # ln 2 with the last 20 bits cleared, so that k * _LN2_HI is exact
_LN2_LO = 1.9082149292705877e-10
_HALF_PI_HI = 1.5707963267341256  # pi/2 likewise
_HALF_PI_LO = 6.077100506506192e-11
_SQRT_HALF_BITS = 0x3FE6A09E667F3BCD  # mantissas are brought to [sqrt(1/2), sqrt(2))
_MANTISSA = 0x000FFFFFFFFFFFFF
_ONE_BITS = 0x3FF0000000000000
_ROUND = 6755399441055744.0  # 1.5 * 2^52: adding and subtracting it rounds to the nearest integer
_INV_LN2 = 1.4426950408889634
_TWO_OVER_PI = 0.6366197723675814
_TAN_PI_8 = 0.41421356237309503
_QUARTER_PI = 0.7853981633974483

_JIT: Any = {"error_model": "numpy", "fastmath": {"contract"}}  # fused multiply-add only: NaN keeps its meaning


@njit(**_JIT)
def log(x: float) -> float:
    """Natural logarithm of a positive normal double."""
    shifted = _bits(x) - _SQRT_HALF_BITS
    k = float(shifted >> 52)
    f = _double((shifted & _MANTISSA) + _SQRT_HALF_BITS) - 1.0
    s = f / (2.0 + f)
    z = s * s
    # 2 artanh(s) = 2 s + s z p(z); written so that the leading f is added last
    p = 0.15331710618210771568 + z * 0.14616585424888621989
    p = 0.18182889455674946039 + z * p
    p = 0.22222211130259877029 + z * p
    p = 0.28571428626003268742 + z * p
    p = 0.39999999999899443233 + z * p
    p = 0.66666666666666696883 + z * p
    half = 0.5 * f * f
    return k * _LN2_HI - ((half - (s * (half + z * p) + k * _LN2_LO)) - f)


@njit(**_JIT)
def exp(x: float) -> float:
    """Exponential; the argument is clamped to +-708 so that the result is a normal double."""
    x = min(max(x, -708.0), 708.0)
    t = x * _INV_LN2 + _ROUND
    k = t - _ROUND
    r = (x - k * _LN2_HI) - k * _LN2_LO
    p = 1.0 / 479001600.0 + r * (1.0 / 6227020800.0)
    p = 1.0 / 39916800.0 + r * p
    p = 1.0 / 3628800.0 + r * p
    p = 1.0 / 362880.0 + r * p
    p = 1.0 / 40320.0 + r * p
    p = 1.0 / 5040.0 + r * p
    p = 1.0 / 720.0 + r * p
    p = 1.0 / 120.0 + r * p
    p = 1.0 / 24.0 + r * p
    p = 1.0 / 6.0 + r * p
    p = 0.5 + r * p
    p = 1.0 + r * p
    p = 1.0 + r * p
    # the low bits of t hold k: shifting them into the exponent field multiplies by 2^k
    return p * _double((_bits(t) << 52) + _ONE_BITS)


@njit(**_JIT)
def atan_quotient(y: float, x: float) -> float:
    """``arctan(y / x)`` for x > 0 (the argument of ``x + i y`` in the right half plane)."""
    v = abs(y)
    big, small = max(v, x), min(v, x)
    # small/big = tan(phi), phi in [0, pi/4]; beyond pi/8 use tan(phi - pi/4) = (small - big)/(small + big)
    upper = small > _TAN_PI_8 * big
    top = small - big if upper else small
    bottom = small + big if upper else big
    q = top / bottom
    z = q * q
    p = 0.039230447784793095235 + z * -0.019175404711104933678
    p = -0.050854078345894842573 + z * p
    p = 0.058581409048663282818 + z * p
    p = -0.066645105255089365988 + z * p
    p = 0.076921831253768920895 + z * p
    p = -0.090909045753064890845 + z * p
    p = 0.11111111015187018721 + z * p
    p = -0.14285714284665680761 + z * p
    p = 0.19999999999995516545 + z * p
    p = -0.33333333333333330156 + z * p
    phi = q + q * z * p
    phi = phi + _QUARTER_PI if upper else phi
    phi = 2.0 * _QUARTER_PI - phi if v > x else phi
    return -phi if y < 0.0 else phi


@njit(**_JIT)
def sincos(x: float) -> tuple[float, float]:
    """``(sin x, cos x)``, modulus of x below about 1e5."""
    t = x * _TWO_OVER_PI + _ROUND
    k = t - _ROUND
    quadrant = _bits(t)
    r = (x - k * _HALF_PI_HI) - k * _HALF_PI_LO
    z = r * r
    s = 1.0 / 355687428096000.0 - z / 121645100408832000.0
    s = -1.0 / 1307674368000.0 + z * s
    s = 1.0 / 6227020800.0 + z * s
    s = -1.0 / 39916800.0 + z * s
    s = 1.0 / 362880.0 + z * s
    s = -1.0 / 5040.0 + z * s
    s = 1.0 / 120.0 + z * s
    s = -1.0 / 6.0 + z * s
    s = r + r * z * s
    c = -1.0 / 6402373705728000.0 + z / 2432902008176640000.0
    c = 1.0 / 20922789888000.0 + z * c
    c = -1.0 / 87178291200.0 + z * c
    c = 1.0 / 479001600.0 + z * c
    c = -1.0 / 3628800.0 + z * c
    c = 1.0 / 40320.0 + z * c
    c = -1.0 / 720.0 + z * c
    c = 1.0 / 24.0 + z * c
    c = 1.0 - (0.5 * z - z * z * c)
    # quadrants 1 and 3 exchange the two; the signs go straight into the sign bits
    swap = (quadrant & 1) == 1
    sine = _bits(c if swap else s) ^ ((quadrant & 2) << 62)
    cosine = _bits(s if swap else c) ^ (((quadrant + 1) & 2) << 62)
    return _double(sine), _double(cosine)
