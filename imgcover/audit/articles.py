"""Which declaration a lot sheet means, and what it declares."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from difflib import get_close_matches
from functools import cached_property
from pathlib import Path

from imgcover.audit.grounds import Grounds, OffGroundsError
from imgcover.errors import LotSheetError

ARTICLE = "article.toml"
LARGEST_FILE = 1_000_000
"""Bytes; the declaration's reader refuses more."""


@dataclass(frozen=True)
class ArticleShelf:
    """The declarations an audit may use.

    Parameters
    ----------
    grounds : Grounds
        Where names are looked for: the audited folder, its folder `articles`, and `--articles`.
    """

    grounds: Grounds

    @classmethod
    def of(cls, folder: Path, articles: Path | None) -> ArticleShelf:
        """Take the declarations of a folder and, where given, of another."""
        own = folder / "articles"
        beside = [own] if own.is_dir() else []
        return cls(Grounds.of([folder, *beside, *([articles] if articles else [])]))

    def find(self, named: str, where: str) -> Path:
        """Find the declaration that a lot sheet's cell names.

        Parameters
        ----------
        named : str
            A file's path with or without `.toml`, a folder with an `article.toml`, or an article's
            code.
        where : str
            Sheet and row, for messages.

        Raises
        ------
        LotSheetError
            When there is none, it leads out, or two declare that code.
        """
        for name in (named, f"{named}.toml", f"{named}/{ARTICLE}"):
            path = self._file(name, where)
            if path is not None:
                return path
        coded = self._by_code.get(named, [])
        if len(coded) > 1:
            both = " and ".join(path.name for path in coded)
            raise LotSheetError(f"{where}, article", f'{both} declare "{named}"', "name the file")
        if coded:
            return coded[0]
        known = [*self._by_code, *(path.stem for path in self._files)]
        close = get_close_matches(named, known, n=1)
        raise LotSheetError(
            f"{where}, article",
            f'no declaration "{named}"',
            f'nearest: "{close[0]}"' if close else "put it in the folder, or name --articles DIR",
        )

    def by_folder(self, picture: Path | None) -> Path | None:
        """Find the `article.toml` that lies beside a picture or in its lot's folder."""
        if picture is None:
            return None
        root = self.grounds.bases[0]
        for folder in picture.parents:
            if not folder.is_relative_to(root):
                return None
            if (folder / ARTICLE).is_file():
                return folder / ARTICLE
        return None

    def _file(self, name: str, where: str) -> Path | None:
        for base in self.grounds.bases:
            try:
                path = Grounds((base,)).resolve(name)
            except OffGroundsError:
                continue
            if path.is_file():
                return path
        try:
            self.grounds.resolve(name)
        except OffGroundsError as fault:
            raise LotSheetError(
                f"{where}, article", str(fault), "put it inside, or name --articles DIR"
            ) from None
        return None

    @cached_property
    def _files(self) -> list[Path]:
        found = {path for base in self.grounds.bases for path in base.glob("*.toml")}
        return sorted(path for path in found if path.is_file())

    @cached_property
    def _by_code(self) -> dict[str, list[Path]]:
        coded: dict[str, list[Path]] = {}
        for path in self._files:
            code = _code(path)
            if code is not None:
                coded.setdefault(code, []).append(path)
        return coded


def _code(path: Path) -> str | None:
    """Read an article's code; a file that cannot be read has none, and is told when it is used."""
    try:
        if path.stat().st_size > LARGEST_FILE:
            return None
        table = tomllib.loads(path.read_text(encoding="utf-8-sig"))
    except (OSError, ValueError, RecursionError):
        return None
    article = table.get("article")
    code = article.get("code") if isinstance(article, dict) else None
    return code if isinstance(code, str) else None


__all__ = ["ArticleShelf"]
