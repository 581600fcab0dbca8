"""Engineering notation in and out: "2.5 GHz" to 2.5e9 and back."""

import math
import re

from quantiphy import QuantiPhyError, Quantity

# What people may write for a unit, beside the unit itself.
ACCEPTED_UNITS: dict[str, tuple[str, ...]] = {
    "Hz": ("Hz", "S/s", "Sps"),
    "ohm": ("ohm", "ohms", "Ω", "Ohm"),
    "ratio": ("", "%"),
    "lsb": ("", "LSB", "lsb"),
    "db": ("", "dB"),
    "m2": ("m2", "m^2", "m²"),
}
_AREA = re.compile(r"^\s*([-+0-9.eE]+)\s*([fpnumkµμ]?)m(?:2|\^2|²)\s*$")
_PREFIX = {
    "f": 1e-15,
    "p": 1e-12,
    "n": 1e-9,
    "u": 1e-6,
    "µ": 1e-6,
    "μ": 1e-6,
    "m": 1e-3,
    "k": 1e3,
    "": 1.0,
}


def parse_quantity(value: object, unit: str) -> float:
    """Return a quantity in SI.

    value: a number (taken as SI) or a text with an SI prefix and the unit; unit: the SI unit, or "ratio", "lsb" or
    "db" for a plain number. Raises ValueError that names what was found and what is accepted.

    >>> parse_quantity("2.5 GHz", "Hz"), parse_quantity(60, "ohm"), parse_quantity("25 um2", "m2")
    (2500000000.0, 60.0, 2.5e-11)
    """
    if isinstance(value, bool) or not isinstance(value, (int, float, str)):
        raise ValueError(f"expected {_example(unit)}, found {value!r}")  # noqa: TRY004 the file's reader wants this one
    if isinstance(value, str):
        number, found = _split(value, unit)
        accepted = ACCEPTED_UNITS.get(unit, (unit,))
        if found not in accepted and found != "":
            raise ValueError(f"expected {_example(unit)}, found {value!r}")
    else:
        number = float(value)
    if not math.isfinite(number):
        raise ValueError(f"expected a finite number, found {value!r}")
    return number


def _split(text: str, unit: str) -> tuple[float, str]:
    area = _AREA.match(text) if unit == "m2" else None
    try:
        if area:  # the prefix of a squared unit is squared with it, which a plain quantity does not know
            return float(area[1]) * _PREFIX[area[2]] ** 2, "m2"
        if text.strip().endswith("%"):
            return float(text.strip()[:-1]) / 100.0, "%"
        quantity = Quantity(text)
    except (QuantiPhyError, ValueError):
        raise ValueError(f"expected {_example(unit)}, found {text!r}") from None
    return float(quantity), quantity.units


def _example(unit: str) -> str:
    if unit in ("ratio", "lsb", "db"):
        return "a plain number"
    if unit == "m2":
        return 'an area such as "25 um2"'
    return f'a number or a quantity in {unit} such as "1.5 {unit}"'


def show(value: float | None, unit: str = "", digits: int = 4) -> str:
    """Print a value in engineering notation with its unit.

    value: SI, or None for "not known"; digits: significant figures.

    >>> show(2.5e9, "Hz"), show(0.1234567, "lsb"), show(2.5e-11, "m2"), show(None, "V")
    ('2.5 GHz', '0.1235 LSB', '25 um2', '-')
    """
    if value is None:
        return "-"
    if unit in ("ratio", ""):
        return f"{value:.{digits}g}"
    if "^" in unit:  # a prefix in front of a power would be misread
        return f"{value:.{digits}g} {unit}"
    if unit == "lsb":
        return f"{value:.{digits}g} LSB"
    if unit == "db":
        return f"{value:.{digits}g} dB"
    if unit == "m2":
        return f"{value * 1e12:.{digits}g} um2"
    if not math.isfinite(value):
        return "unlimited"
    return Quantity(value, unit).render(prec=digits - 1)
