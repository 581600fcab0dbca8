"""Sizes of a cell: one width and length for each group of equal devices, and the bias of its static parts."""

from dataclasses import dataclass

from flashplan.errors import InputError


@dataclass(frozen=True)
class Size:
    """Gate width and length in m."""

    width: float
    length: float


Sizes = dict[str, Size]


def require_groups(sizes: Sizes, groups: tuple[str, ...], topology: str) -> None:
    """Raise InputError unless exactly these groups have a size."""
    missing = [name for name in groups if name not in sizes]
    unknown = [name for name in sizes if name not in groups]
    if missing or unknown:
        raise InputError(
            f"sizes of {topology} are for {', '.join(groups)};"
            f" missing {missing or 'none'}, unknown {unknown or 'none'}"
        )
