"""Published flash and subranging converters, to place a plan among what has been built.

Data: B. Murmann, "ADC Performance Survey 1997-2025" (BSD 3-Clause; see published_converters_licence.txt).
"""

import csv
from dataclasses import dataclass
from importlib.resources import files

from flashplan.metrics.ideal import enob_from_sndr

CITATION = 'B. Murmann, "ADC Performance Survey 1997-2025" (public data collection, BSD 3-Clause, (c) 2022 Boris Murmann)'


@dataclass(frozen=True)
class PublishedConverter:
    """One published part: rate is its Nyquist rate where given, else its sample rate, in Hz."""

    year: int
    venue: str
    paper: str
    architecture: str
    bits: float | None
    rate: float
    power: float
    sndr_db: float
    walden_fom: float

    @property
    def enob(self) -> float:
        """Effective bits at the survey's high input frequency."""
        return enob_from_sndr(self.sndr_db)

    @property
    def energy(self) -> float:
        """Energy per conversion in J."""
        return self.power / self.rate


def walden_figure(power: float, rate: float, sndr_db: float) -> float:
    """Walden figure of merit P / (2^ENOB f_s), in J per conversion step.

    power in W, rate in Hz. Source: R. H. Walden, "Analog-to-digital converter survey and analysis", IEEE J. Sel.
    Areas Commun. 17(4), 1999 (memory).

    >>> print(f"{walden_figure(0.545, 1.3e9, 35.0) * 1e15:.0f} fJ")
    9126 fJ
    """
    return power / (2.0 ** enob_from_sndr(sndr_db) * rate)


def published_converters() -> list[PublishedConverter]:
    """Rows that give SNDR, power and rate, in the survey's order."""
    text = (
        files("flashplan.report")
        .joinpath("published_converters.csv")
        .read_text(encoding="utf-8")
    )
    found = []
    for row in csv.DictReader(text.splitlines()):
        rate = row["nyquist_rate_hz"] or row["sample_rate_hz"]
        if not (row["sndr_db"] and row["power_w"] and rate):
            continue
        found.append(
            PublishedConverter(
                int(row["year"]),
                row["venue"],
                row["paper"],
                row["architecture"],
                float(row["bits"]) if row["bits"] else None,
                float(rate),
                float(row["power_w"]),
                float(row["sndr_db"]),
                float(row["walden_fom_fj"]) * 1e-15,
            )
        )
    return found
