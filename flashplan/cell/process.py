"""A process description: what the device equation, mismatch and noise need of a CMOS process."""

import math
import tomllib
from collections.abc import Mapping
from importlib import resources
from pathlib import Path
from typing import Annotated, Any, Literal

from pydantic import Field, ValidationError

from flashplan.errors import InputError
from flashplan.plan.fields import Table, Unit

BOLTZMANN = 1.380649e-23  # J/K
ELECTRON = 1.602176634e-19  # C

Corner = Literal["typical", "slow", "fast"]


class Polarity(Table):
    """One kind of transistor, all in SI at the process's reference temperature.

    mobility_factor is mobility times oxide capacitance; saturation_velocity of the carriers; early_field the Early
    voltage per channel length; the matching coefficients are of a pair's difference; thermal_noise_factor multiplies
    the noise of the channel's charge; flicker_noise K in S_vg = K / (C_ox W L f); capacitances are per gate width.
    corner_threshold and corner_mobility say how far the slow and fast corners lie.
    """

    mobility_factor: Annotated[float, Unit("A/V2", gt=0, lt=0.1)]
    threshold: Annotated[float, Unit("V", gt=0, lt=3)]
    slope_factor: Annotated[float, Unit("ratio", ge=1, lt=3)]
    saturation_velocity: Annotated[float, Unit("m/s", gt=1e3, lt=1e7)]
    early_field: Annotated[float, Unit("V/m", gt=0)]
    threshold_matching: Annotated[float, Unit("V m", ge=0, lt=1e-6)]
    beta_matching: Annotated[float, Unit("m", ge=0, lt=1e-6)]
    thermal_noise_factor: Annotated[float, Unit("ratio", ge=0.5, le=10)] = 1.0
    flicker_noise: Annotated[float, Unit("V2F", ge=0, lt=1e-18)] = 0.0
    junction_capacitance: Annotated[float, Unit("F/m", ge=0, lt=1e-7)]
    overlap_capacitance: Annotated[float, Unit("F/m", ge=0, lt=1e-7)]
    threshold_drift: Annotated[float, Unit("V/K", ge=0, lt=0.01)] = 1e-3
    mobility_exponent: Annotated[float, Unit("ratio", ge=0, le=3)] = 1.5
    corner_threshold: Annotated[float, Unit("V", ge=0, lt=0.5)] = 0.04
    corner_mobility: Annotated[float, Unit("ratio", ge=0, lt=0.5)] = 0.08


class Process(Table):
    """A whole process; `temperature` is the one its values hold at and circuits run at."""

    name: str
    note: str = ""
    supply: Annotated[float, Unit("V", gt=0, le=20)]
    temperature: Annotated[float, Unit("K", gt=150, lt=500)] = 300.0
    oxide_capacitance: Annotated[float, Unit("F/m2", gt=1e-4, lt=0.1)]
    minimum_length: Annotated[float, Unit("m", gt=1e-9, lt=1e-4)]
    minimum_width: Annotated[float, Unit("m", gt=1e-9, lt=1e-4)]
    nmos: Polarity
    pmos: Polarity
    source: Annotated[str, Field(exclude=True)] = "process"

    @property
    def thermal_voltage(self) -> float:
        """k T / q, in V."""
        return BOLTZMANN * self.temperature / ELECTRON


def generic_names() -> list[str]:
    """Names of the descriptions that are shipped: generic values of published ranges, no foundry's."""
    folder = resources.files("flashplan.cell") / "processes"
    return sorted(
        item.name.removesuffix(".toml")
        for item in folder.iterdir()
        if item.name.endswith(".toml")
    )


def load_process(name_or_path: str | Path) -> Process:
    """A shipped description by name, or a file of one's own. Raises InputError with the file and key path."""
    text = str(name_or_path)
    if text in generic_names():
        file = resources.files("flashplan.cell") / "processes" / f"{text}.toml"
        with resources.as_file(file) as path:
            return process_from_table(_read(path), text)
    if not Path(text).is_file():
        raise InputError(
            f"neither a file nor a shipped process; shipped are {', '.join(generic_names())}",
            text,
        )
    table = _read(Path(text))
    if "characterisation" in table:
        from flashplan.cell.characterisation import process_from_characterisation

        return process_from_characterisation(table, Path(text))
    return process_from_table(table, text)


def _read(path: Path) -> dict[str, Any]:
    try:
        return tomllib.loads(path.read_text(encoding="utf-8"))
    except OSError as error:
        raise InputError(f"cannot read the file: {error.strerror}", str(path)) from None
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise InputError(f"not a TOML file: {error}", str(path)) from None


def process_from_table(table: Mapping[str, Any], source: str = "process") -> Process:
    """Validate a description given as nested mappings. Raises InputError that names the key path."""
    try:
        return Process.model_validate({**table, "source": source})
    except ValidationError as error:
        first = error.errors(include_url=False)[0]
        path = ".".join(str(part) for part in first["loc"])
        kind = first["type"]
        if kind == "missing":
            text = "missing key"
        elif kind == "extra_forbidden":
            text = "unknown key"
        else:
            text = f"{first['msg']}; found {first['input']!r}"
        raise InputError(text, f"{source}: {path}") from None


def choose_process(supply: float) -> Process:
    """The shipped description whose supply is nearest to a plan's, by ratio; of equals the shorter gate."""
    found = [load_process(name) for name in generic_names()]
    return min(
        found,
        key=lambda p: (round(abs(math.log(p.supply / supply)), 6), p.minimum_length),
    )


def at_corner(process: Process, nmos: Corner, pmos: Corner) -> Process:
    """The process with each polarity slow, typical or fast: threshold up and mobility down, or the reverse."""

    def moved(kind: Polarity, corner: Corner) -> Polarity:
        sign = {"slow": 1.0, "typical": 0.0, "fast": -1.0}[corner]
        return kind.model_copy(
            update={
                "threshold": kind.threshold + sign * kind.corner_threshold,
                "mobility_factor": kind.mobility_factor
                * (1.0 - sign * kind.corner_mobility),
            }
        )

    return process.model_copy(
        update={
            "nmos": moved(process.nmos, nmos),
            "pmos": moved(process.pmos, pmos),
            "name": f"{process.name} {nmos}-{pmos}",
        }
    )


def at_temperature(process: Process, temperature: float) -> Process:
    """The process at another temperature in K: threshold falls linearly, mobility as a power of T.

    Raises InputError outside 150 to 500 K.
    """
    if not 150.0 < temperature < 500.0:
        raise InputError(
            f"temperature must lie between 150 and 500 K; found {temperature:g}",
            process.source,
        )
    rise = temperature - process.temperature

    def moved(kind: Polarity) -> Polarity:
        return kind.model_copy(
            update={
                "threshold": kind.threshold - kind.threshold_drift * rise,
                "mobility_factor": kind.mobility_factor
                * (temperature / process.temperature) ** -kind.mobility_exponent,
            }
        )

    return process.model_copy(
        update={
            "temperature": temperature,
            "nmos": moved(process.nmos),
            "pmos": moved(process.pmos),
        }
    )
