"""Complaints about settings: each with its place, all of one reading at once."""

from collections.abc import Iterable
from dataclasses import dataclass

from gateway.errors import BrimwardError


@dataclass(frozen=True, slots=True, order=True)
class Complaint:
    """One thing that is wrong: where, and a sentence that says what was found, what was expected, what is nearest."""

    file: str
    line: int
    column: int
    message: str

    def __str__(self) -> str:
        """Return the complaint as one printable line that editors can jump to, whatever the settings hold."""
        text = f"{self.file}:{self.line}:{self.column}: {self.message}"
        return "".join(one if one.isprintable() else "\N{REPLACEMENT CHARACTER}" for one in text)


class SettingsError(BrimwardError):
    """Settings that cannot be used; `complaints` are in the order of files and lines."""

    def __init__(self, complaints: Iterable[Complaint]) -> None:
        self.complaints = tuple(sorted(set(complaints)))
        super().__init__("\n".join(str(complaint) for complaint in self.complaints))
