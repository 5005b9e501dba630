"""Everything that can go wrong, as one tree.

BranchposError
├── InputError            something given to the program cannot be used
│   ├── FormatError       the bytes follow no format the program reads, or break the one they claim
│   │   └── TruncatedError    the file stops before it is whole
│   ├── SpectrumError     the numbers read are not a spectrum the program can judge
│   ├── NamingError       a structure name or line notation cannot be read
│   └── SettingsError     an option or a method-file entry is out of range or unknown
├── ReferenceDataError    a shipped or refitted reference set is missing or inconsistent
└── OverlapError          data meant to be kept apart are the same data
"""

from __future__ import annotations


class BranchposError(Exception):
    """Root of all errors raised on purpose."""


class InputError(BranchposError):
    """Something given to the program cannot be used.

    Parameters
    ----------
    problem : what is wrong, with the offending value.
    file : path of the file, as the user gave it.
    place : line, scan, block or field inside the file.
    remedy : what to do next.

    >>> print(InputError("intensity is -3.0", file="peak1.txt", place="line 4", remedy="remove the row"))
    peak1.txt: line 4: intensity is -3.0; remove the row
    """

    def __init__(self, problem: str, *, file: str = "", place: str = "", remedy: str = "") -> None:
        self.problem, self.file, self.place, self.remedy = problem, file, place, remedy
        super().__init__(problem)

    def __str__(self) -> str:
        where = [part for part in (self.file, self.place) if part]
        message = ": ".join([*where, self.problem])
        return f"{message}; {self.remedy}" if self.remedy else message

    def located(self, *, file: str = "", place: str = "") -> InputError:
        """Return the same error with file and place filled in where they were empty."""
        return type(self)(self.problem, file=self.file or file, place=self.place or place, remedy=self.remedy)


class FormatError(InputError):
    """The bytes follow no format the program reads, or break the one they claim."""


class TruncatedError(FormatError):
    """The file stops before it is whole."""


class SpectrumError(InputError):
    """The numbers read are not a spectrum the program can judge."""


class NamingError(InputError):
    """A structure name or line notation cannot be read."""


class SettingsError(InputError):
    """An option or a method-file entry is out of range or unknown."""


class ReferenceDataError(BranchposError):
    """A shipped or refitted reference set is missing or inconsistent."""


class OverlapError(BranchposError):
    """Data meant to be kept apart are the same data."""
