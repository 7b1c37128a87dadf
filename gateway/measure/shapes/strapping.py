"""Strapping tables: volumes measured at levels, straight lines between them."""

from bisect import bisect_right
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise


@dataclass(frozen=True, slots=True)
class Strapping:
    """Volumes in m3 at levels in m, both rising; level and volume begin with the first pair.

    Raises ValueError, naming the pair, where they do not rise.
    """

    levels: tuple[float, ...]
    volumes: tuple[float, ...]

    def __post_init__(self) -> None:
        if len(self.levels) < 2 or len(self.levels) != len(self.volumes):
            raise ValueError("a strapping table has two pairs or more: [[0 m, 0 l], [1 m, 800 l]]")
        if self.levels[0] != 0 or self.volumes[0] != 0:
            raise ValueError("a strapping table begins with the lowest inside point: `[0 m, 0 l]`")
        pairs = zip(self.levels, self.volumes, strict=True)
        for (level, volume), (level_2, volume_2) in pairwise(pairs):
            if level_2 <= level or volume_2 <= volume:
                raise ValueError(
                    f"the pair at {level_2:g} m is not above the one at {level:g} m in both columns; both must rise"
                )

    @property
    def height(self) -> float:
        """The total height inside."""
        return self.levels[-1]

    def volume(self, level: float) -> float:
        """Return the volume in m3 up to `level` in m."""
        return _between(self.levels, self.volumes, level)

    def level(self, volume: float) -> float:
        """Return the level in m at which `volume` in m3 stands."""
        return _between(self.volumes, self.levels, volume)

    def area(self, level: float) -> float:
        """Return the free surface in m2 at `level` in m: the slope of the line there."""
        k = _stretch(self.levels, level)
        return (self.volumes[k + 1] - self.volumes[k]) / (self.levels[k + 1] - self.levels[k])


def _stretch(xs: Sequence[float], x: float) -> int:
    return min(max(bisect_right(xs, x) - 1, 0), len(xs) - 2)


def _between(xs: Sequence[float], ys: Sequence[float], x: float) -> float:
    if x >= xs[-1]:
        return ys[-1]
    if x <= xs[0]:
        return ys[0]
    k = _stretch(xs, x)
    return ys[k] + (ys[k + 1] - ys[k]) * ((x - xs[k]) / (xs[k + 1] - xs[k]))
