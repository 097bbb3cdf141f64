"""What can go wrong with the world outside: files, declarations, certificates, stores.

    ImgcoverError
    ├── PictureError        a picture that cannot be read whole
    ├── ScaleError          a pitch, rule or sheet that is stated wrongly
    ├── DeclarationError    an article file that says something impossible or unknown
    ├── CertificateError    a device certificate that is damaged or of another kind
    ├── LotSheetError       a lot sheet with unknown columns, bad cells or escaping paths
    ├── ClusterError        a scheduler that cannot be trusted, reached or used
    ├── LedgerError         a ledger that cannot be read or written
    ├── OptionError         an option, or a lot sheet's cell, that says something impossible
    └── OutputError         an output file that cannot be written

A weak number is not an error: it is a finding (`imgcover.findings`). A wrong call is a
`ValueError`.
"""

from __future__ import annotations


class ImgcoverError(Exception):
    """Something outside the program is not as it must be.

    Parameters
    ----------
    where : str
        The file or option, and the key inside it where there is one.
    fault : str
        What was expected and what came.
    remedy : str
        The next thing to try.
    """

    def __init__(self, where: str, fault: str, remedy: str) -> None:
        super().__init__(where, fault, remedy)
        self.where = where
        self.fault = fault
        self.remedy = remedy

    def __str__(self) -> str:
        return f"{self.where}: {self.fault}; {self.remedy}"


class PictureError(ImgcoverError):
    """A picture that is missing, damaged, of no known kind, or too large."""


class ScaleError(ImgcoverError):
    """A pitch, rule or sheet that is stated wrongly."""


class DeclarationError(ImgcoverError):
    """An article file that says something impossible, unknown or ambiguous."""


class CertificateError(ImgcoverError):
    """A device certificate that is damaged, or of another kind than was asked for."""


class LotSheetError(ImgcoverError):
    """A lot sheet with unknown columns, bad cells, or paths that lead out of its folder."""


class ClusterError(ImgcoverError):
    """A scheduler that cannot be trusted, reached, or used because its workers differ."""


class LedgerError(ImgcoverError):
    """A ledger that cannot be opened, read or written."""


class OptionError(ImgcoverError):
    """An option, or a lot sheet's cell, that says something impossible."""


class OutputError(ImgcoverError):
    """An output file or folder that cannot be written."""
