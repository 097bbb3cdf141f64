"""From what a folder lists to what is asked of each picture, and the key that shows a change."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import asdict, dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from imgcover.asking import certificate
from imgcover.audit.folder import Listed
from imgcover.audit.grounds import Grounds, OffGroundsError, read_file
from imgcover.cloth.declaration import Declaration, read_declaration
from imgcover.errors import CertificateError, DeclarationError, ImgcoverError, LotSheetError
from imgcover.findings import Finding, Flag, found
from imgcover.ledger.canonical import canonical
from imgcover.ledger.record import Sample
from imgcover.request import Enclosed, Options, read_options

FILE_WORDS = ("blank", "dark", "device")
"""Options that name files; in a lot sheet they must lie inside the audited folder."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Order:
    """One picture, and everything a worker needs to measure it.

    Parameters
    ----------
    name : str
        Of the picture, as told.
    path : Path or None
        Its file; None where `fault` says why there is none.
    content : bytes or None
        What the file holds, for a worker that does not see this disk.
    fault : str
        Empty, or why it cannot be read.
    options, declaration, sample
        As in `imgcover.request.Request`.
    notes : tuple of Finding
        What was noticed before it was opened.
    """

    name: str
    path: Path | None
    content: bytes | None = None
    fault: str
    options: Options
    declaration: Declaration | None
    sample: Sample
    notes: tuple[Finding, ...]


class OrderBook:
    """Writes the orders of an audit; files that many pictures share are read once.

    Parameters
    ----------
    grounds : Grounds
        Where a lot sheet's names may lead.
    defaults : mapping of str to str
        Options for every picture, by name; a lot sheet's cell counts before them.
    versions : mapping of str to str
        Of the program and its libraries.
    """

    def __init__(
        self, grounds: Grounds, *, defaults: Mapping[str, str], versions: Mapping[str, str]
    ) -> None:
        self._grounds = grounds
        self._defaults = dict(defaults)
        self.versions = dict(versions)
        self._options: dict[tuple[tuple[str, str], ...], Options] = {}
        self._declarations: dict[Path, Declaration | DeclarationError] = {}
        self._certificates: dict[str | Enclosed, tuple[str, bool]] = {}
        self._digests: dict[Path, str] = {}

    @property
    def faults(self) -> list[DeclarationError]:
        """What is wrong with the declarations that were met."""
        return [said for said in self._declarations.values() if isinstance(said, DeclarationError)]

    def order(self, listed: Listed) -> Order:
        """Write the order for one picture.

        Raises
        ------
        LotSheetError
            When its row says something impossible; row and column are named.
        CertificateError
            When the certificate that all pictures share cannot be read.
        """
        declared = self.declared(listed.article)
        options = self._read(listed)
        try:
            self._certificate(options.device)
        except CertificateError as fault:
            if "device" not in listed.options:
                raise
            raise LotSheetError(
                f"{listed.where}, device", f"{fault.where}: {fault.fault}", fault.remedy
            ) from None
        unread = isinstance(declared, DeclarationError)
        return Order(
            name=listed.name,
            path=listed.path,
            fault=listed.fault,
            options=options,
            declaration=None if isinstance(declared, DeclarationError) else declared,
            sample=Sample(**{**listed.sample}),
            notes=(found(Flag.DECLARATION_UNREADABLE, str(declared)),) if unread else (),
        )

    def declared(self, path: Path | None) -> Declaration | DeclarationError | None:
        """Read a declaration once; an unreadable one is kept as what is wrong with it."""
        if path is None:
            return None
        if path not in self._declarations:
            try:
                self._declarations[path] = read_declaration(path)
            except DeclarationError as fault:
                self._declarations[path] = fault
        return self._declarations[path]

    def key(self, order: Order, picture_sha256: str | None) -> str:
        """Hash everything that could change a digit or a decision of a picture's record.

        Parameters
        ----------
        order : Order
        picture_sha256 : str or None
            Of the file's bytes.
        """
        declaration, options = order.declaration, order.options
        parts: dict[str, Any] = {
            "picture": picture_sha256,
            "name": order.name,
            "fault": order.fault,
            "declaration": None if declaration is None else declaration.sha256,
            "notes": [each.message for each in order.notes],
            "options": options.record(),
            "sample": asdict(order.sample),
            "device": self._certificate(options.device),
            "blank": self._digest(options.blank),
            "dark": self._digest(options.dark),
            "versions": self.versions,
        }
        return hashlib.sha256(canonical(parts).encode("utf-8", "backslashreplace")).hexdigest()

    def _certificate(self, device: str | Enclosed | None) -> tuple[str, bool] | None:
        """What a certificate holds, and whether it is valid today: both can touch a decision."""
        if device is None:
            return None
        if device not in self._certificates:
            held = certificate(device)
            assert held is not None
            valid = held.made <= datetime.now(UTC).date() <= held.valid_until
            self._certificates[device] = (held.sha256, valid)
        return self._certificates[device]

    def _digest(self, path: Path | Enclosed | None) -> str | None:
        """Hash a file that pictures share; one that cannot be read stands for itself."""
        if path is None:
            return None
        if isinstance(path, Enclosed):
            return path.sha256
        if path not in self._digests:
            try:
                self._digests[path] = hashlib.sha256(read_file(path.resolve())).hexdigest()
            except OffGroundsError:
                self._digests[path] = str(path)
        return self._digests[path]

    def _read(self, listed: Listed) -> Options:
        words = {**self._defaults, **listed.options}
        if "pitch" in listed.options and "pitch-y" not in listed.options:
            # the sheet's pitch replaces the whole default scale, not half of it
            words.pop("pitch-y", None)
        for name in FILE_WORDS:
            if name in listed.options:
                words[name] = self._inside(name, listed)
        key = tuple(sorted(words.items()))
        if key not in self._options:
            try:
                self._options[key] = read_options(words)
            except LotSheetError:
                raise
            except ImgcoverError as fault:
                if not listed.options:
                    raise
                column = fault.where.removeprefix("--")
                raise LotSheetError(
                    f"{listed.where}, {column}", fault.fault, fault.remedy
                ) from None
        return self._options[key]

    def _inside(self, name: str, listed: Listed) -> str:
        named = listed.options[name]
        try:
            path = self._grounds.resolve(named)
        except OffGroundsError as fault:
            raise LotSheetError(
                f"{listed.where}, {name}", str(fault), "put it inside the audited folder"
            ) from None
        if path.is_file():
            return str(path)
        if name == "device" and not path.suffix:
            return named  # a certificate known by its name
        raise LotSheetError(f"{listed.where}, {name}", f'no file "{named}"', "check its name")


__all__ = ["Order", "OrderBook"]
