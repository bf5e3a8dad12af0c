"""How numbers are shown to people: few digits, and never rounded to the flattering side."""

from decimal import ROUND_CEILING, ROUND_FLOOR, ROUND_HALF_EVEN, Context, Decimal
from typing import Literal

Towards = Literal["down", "up", "nearest"]

THOUSANDS_APART_FROM = 10_000
_NOISE = Decimal("1e-11")  # percent; what floating point adds below this is no reason to round a figure down or up
_MODES = {"down": ROUND_FLOOR, "up": ROUND_CEILING, "nearest": ROUND_HALF_EVEN}


def rounded(value: float, places: int, towards: Towards = "nearest") -> Decimal:
    """The value to `places` decimals, rounded down, up or to nearest."""
    context = Context(prec=60, rounding=_MODES[towards])
    return Decimal(repr(float(value))).quantize(Decimal(1).scaleb(-places), context=context)


def percent(share: float, towards: Towards = "nearest", places: int | None = None, fixed: bool = False) -> str:
    """A share in percent as a person writes it: 0.9342 -> '93.4 %', 0.0005 -> '0.05 %', 0.999995 -> '99.9995 %'.

    Without `places`, one decimal, or as many as two significant digits need of the share or of what it lacks to 1.
    fixed: keep all decimals, as a column of figures wants them.
    """
    hundred = (Decimal(repr(float(share))) * 100).quantize(_NOISE)
    if places is None:
        nearest_end = min(abs(hundred), abs(100 - hundred))
        places = 1 if nearest_end == 0 else max(1, 1 - nearest_end.adjusted())
    context = Context(prec=60, rounding=_MODES[towards])
    shown = hundred.quantize(Decimal(1).scaleb(-min(places, 12)), context=context)
    return f"{shown:f} %" if fixed else f"{_plain(shown)} %"


def proportion(value: float, towards: Towards = "nearest", significant: int = 4) -> str:
    """A proportion with four decimals, or four significant digits when it is small."""
    exact = Decimal(repr(float(value)))
    places = significant if exact == 0 else max(significant, significant - 1 - exact.adjusted())
    context = Context(prec=60, rounding=_MODES[towards])
    return str(exact.quantize(Decimal(1).scaleb(-places), context=context))


def whole(count: int) -> str:
    """A count with its thousands set apart from 10 000 on, as in 1 000 000."""
    return f"{count:,}".replace(",", "\u202f") if count >= THOUSANDS_APART_FROM else str(count)


def _plain(value: Decimal) -> str:
    """Without an exponent and without zeros that say nothing."""
    text = f"{value:f}"
    return text.rstrip("0").rstrip(".") if "." in text else text
