"""Which pictures an audited folder holds, in which order, and what is known of each."""

from __future__ import annotations

import os
import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import NamedTuple

from imgcover.audit.articles import ArticleShelf
from imgcover.audit.grounds import Grounds, OffGroundsError
from imgcover.audit.lot_sheet import (
    OPTION_COLUMNS,
    SAMPLE_COLUMNS,
    SHEET_NAMES,
    SheetRow,
    find_sheet,
    read_sheet,
    tables,
)
from imgcover.audit.out_folder import REPORTS
from imgcover.errors import LotSheetError
from imgcover.report.plain import plain

PAPERS = frozenset(
    {
        *(".toml", ".csv", ".tsv", ".xlsx", ".xls", ".ods", ".txt", ".md", ".rst", ".json"),
        *(".jsonl", ".pdf", ".html", ".htm", ".doc", ".docx", ".sqlite", ".log", ".xmp", ".part"),
    }
)
"""What lies in a lot's folder and is no picture by its ending. Everything else is taken for one: a
picture under a wrong name must end as a finding, not be passed over."""
LITTER = frozenset({"thumbs.db", "desktop.ini", "ehthumbs.db"})
"""What file browsers leave behind; names that begin with a dot are passed over too."""

MOST_NAMED = 12
"""Names in one sentence, such as those of pictures that the lot sheet leaves out."""
DEEPEST = 30
"""Folders inside folders; nobody files swatches deeper, and a trap is not followed for ever."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Listed:
    """One picture to be measured.

    Parameters
    ----------
    name : str
        As told: relative to the folder, plain text.
    path : Path or None
        Resolved and inside; None where `fault` says why there is none.
    fault : str
        Empty, or why the picture cannot be read.
    where : str
        Its row in the lot sheet, or the folder it lies in; for messages.
    sample : dict of str to str
        lot, article, piece, place, operator, conditioned, note; only those that are known.
    options : dict of str to str
        light, pitch and so on, as the sheet's row writes them.
    article : Path or None
        The declaration's file.
    """

    name: str
    path: Path | None
    fault: str = ""
    where: str
    sample: dict[str, str] = field(default_factory=dict)
    options: dict[str, str] = field(default_factory=dict)
    article: Path | None = None

    @property
    def lot(self) -> str:
        """The lot it belongs to."""
        return self.sample["lot"]


class LotName(NamedTuple):
    """What a lot is known by: two articles under one lot's name are two lots."""

    lot: str
    article: Path | None

    @property
    def paper(self) -> str:
        """The declaration's file name; empty where there is none."""
        return "" if self.article is None else self.article.name


@dataclass(frozen=True, slots=True)
class Listing:
    """Everything an audit of a folder has to do.

    Parameters
    ----------
    pictures : tuple of Listed
        In the order in which they are told.
    unlisted : tuple of str
        Pictures that lie in the folder but not in its lot sheet.
    sheet : str
        The lot sheet's name; empty where sub-folders are the lots.
    strays : tuple of str
        Tables that lie in a folder without a lot sheet: none has its name.
    """

    pictures: tuple[Listed, ...]
    unlisted: tuple[str, ...]
    sheet: str
    strays: tuple[str, ...] = ()

    @property
    def notes(self) -> list[str]:
        """What lies in the folder and was passed over."""
        said = []
        if self.strays:
            said.append(
                f"sub-folders were taken for lots; not read, for a lot sheet is called"
                f" {' or '.join(SHEET_NAMES)}: {some_of(self.strays)}"
            )
        if self.unlisted:
            said.append(f"in the folder but not in {self.sheet}: {some_of(self.unlisted)}")
        return said

    def lots(self) -> dict[LotName, list[int]]:
        """Group the pictures, by their place in the list, under their lots."""
        lots: dict[LotName, list[int]] = {}
        for index, picture in enumerate(self.pictures):
            lots.setdefault(LotName(picture.lot, picture.article), []).append(index)
        return lots


def some_of(names: Sequence[str]) -> str:
    """Name the first of many, and say how many more there are."""
    more = f" and {len(names) - MOST_NAMED} more" if len(names) > MOST_NAMED else ""
    return f"{', '.join(names[:MOST_NAMED])}{more}"


def list_folder(folder: Path, *, articles: Path | None, left_out: Sequence[Path] = ()) -> Listing:
    """List the pictures of a folder, by its lot sheet or by its sub-folders.

    Parameters
    ----------
    folder : Path
        The audited folder.
    articles : Path or None
        Another folder with declarations.
    left_out : sequence of Path
        Folders inside that are not listed: where the audit writes.

    Raises
    ------
    LotSheetError
        When the folder or its sheet cannot be read, a row is wrong, or there is no picture.
    """
    if not folder.is_dir():
        raise LotSheetError(str(folder), "is not a folder", "name the folder that holds the lots")
    grounds = Grounds.of([folder, *([articles] if articles else [])])
    shelf = ArticleShelf.of(folder, articles)
    sheet = find_sheet(folder)
    lain = list(_walk(grounds.bases[0], {path.resolve() for path in left_out}))
    if sheet is None:
        pictures = tuple(_by_folder(grounds, lain))
        strays = tuple(_told(path, folder) for path in tables(folder))
        return _not_empty(folder, Listing(pictures, (), "", strays))
    pictures = tuple(_by_sheet(read_sheet(sheet), grounds, shelf))
    listed = {picture.path for picture in pictures}
    listed |= {_reached(grounds, name)[0] for name in _light_frames(pictures)}
    unlisted = tuple(
        _told(path, grounds.bases[0])
        for path in lain
        if Path(os.path.realpath(path)) not in listed and path.suffix.lower() in PICTURE_ENDINGS
    )
    return _not_empty(folder, Listing(pictures, unlisted, sheet.name))


PICTURE_ENDINGS = frozenset({".png", ".jpg", ".jpeg", ".tif", ".tiff", ".bmp", ".webp"})
"""Beside a lot sheet only these are told as unlisted: the sheet says what counts."""


def _not_empty(folder: Path, listing: Listing) -> Listing:
    if not listing.pictures:
        raise LotSheetError(
            str(folder),
            "holds no picture",
            f"put pictures in a sub-folder for each lot, or list them in {SHEET_NAMES[0]}",
        )
    return listing


def _by_sheet(rows: Sequence[SheetRow], grounds: Grounds, shelf: ArticleShelf) -> Iterator[Listed]:
    seen: dict[str | Path, str] = {}
    meant: dict[str, Path] = {}
    for row in rows:
        picture = row.cells["picture"]
        path, fault = _reached(grounds, picture)
        earlier = seen.setdefault(path or picture, row.where)
        if earlier != row.where:
            raise LotSheetError(
                f"{row.where}, picture", f"{earlier} lists it too", "keep one row a picture"
            )
        named = row.get("article")
        if named is not None and named not in meant:
            meant[named] = shelf.find(named, row.where)
        yield Listed(
            name=plain(picture),
            path=path,
            fault=fault,
            where=row.where,
            sample={column: row.cells[column] for column in SAMPLE_COLUMNS if row.get(column)},
            options={column: row.cells[column] for column in OPTION_COLUMNS if row.get(column)},
            article=shelf.by_folder(path) if named is None else meant[named],
        )


def _by_folder(grounds: Grounds, lain: Sequence[Path]) -> Iterator[Listed]:
    root = grounds.bases[0]
    for path in lain:
        inner = path.relative_to(root)
        if path.suffix.lower() in PAPERS or path.name.lower() in LITTER:
            continue
        top = root / inner.parts[0] if len(inner.parts) > 1 else root
        reached, fault = _reached(grounds, inner)
        article = top / "article.toml"
        yield Listed(
            name=_told(path, root),
            path=reached,
            fault=fault,
            where=_told(top, root.parent),
            sample={"lot": plain(_unicode(top.name or "lot"))},
            article=article if article.is_file() else None,
        )


def _reached(grounds: Grounds, name: str | Path) -> tuple[Path | None, str]:
    try:
        return grounds.resolve(name), ""
    except OffGroundsError as fault:
        return None, str(fault)


def _light_frames(pictures: Sequence[Listed]) -> set[str]:
    return {
        picture.options[column]
        for picture in pictures
        for column in ("blank", "dark")
        if column in picture.options
    }


def _walk(folder: Path, left_out: set[Path], depth: int = 0) -> Iterator[Path]:
    """Go through a folder in a person's order; links to folders are told, not followed."""
    try:
        with os.scandir(folder) as entries:
            found = sorted(entries, key=lambda entry: _natural(entry.name))
    except OSError:
        yield folder
        return
    if depth and {entry.name for entry in found} >= REPORTS:
        return  # an audit wrote here: its small pictures are no goods
    for entry in found:
        path = Path(entry.path)
        if entry.name.startswith("."):
            continue
        if not entry.is_dir(follow_symlinks=False) or depth == DEEPEST:
            yield path
        elif path not in left_out:
            yield from _walk(path, left_out, depth + 1)


def _natural(name: str) -> tuple[list[tuple[bool, int, str]], bytes]:
    """Put swatch 2 before swatch 10."""
    parts = re.findall(r"[0-9]+|[^0-9]+", name.casefold())
    keyed = [(not part[0].isascii() or not part[0].isdigit(), part) for part in parts]
    return (
        [(text, 0 if text else int(part), part) for text, part in keyed],
        os.fsencode(name),
    )


def _told(path: Path, root: Path) -> str:
    """Write a path as text that steers nothing, the same on every system."""
    return plain(_unicode(path.relative_to(root).as_posix()))


def _unicode(name: str) -> str:
    """Show bytes of a name that are no Unicode as escapes."""
    return os.fsencode(name).decode("utf-8", "backslashreplace")


__all__ = ["Listed", "Listing", "LotName", "list_folder", "some_of"]
