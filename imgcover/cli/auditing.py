"""`imgcover audit`, carried out: rounds over the folder, told on the way and at the end."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping
from contextlib import ExitStack
from dataclasses import dataclass
from pathlib import Path
from typing import Literal

from imgcover import __version__
from imgcover.audit.crew import LocalCrew
from imgcover.audit.digests import Digests
from imgcover.audit.folder import Listing, list_folder
from imgcover.audit.grounds import Grounds
from imgcover.audit.machine import jobs_that_fit
from imgcover.audit.orders import OrderBook
from imgcover.audit.out_folder import OutFolder, foreign
from imgcover.audit.outcome import Crew
from imgcover.audit.run import How, Round, Told, measure_all
from imgcover.audit.settling import Settling, looks, signature
from imgcover.audit.telling import ToldLot, older_pages, sum_lots, write_reports
from imgcover.audit.work import measure_one
from imgcover.cli.exits import ExitCode, gravest
from imgcover.cli.measuring import code_of
from imgcover.cli.output import opened, tell
from imgcover.cli.progress import Progress
from imgcover.errors import LotSheetError, OptionError
from imgcover.ledger.provenance import library_versions
from imgcover.ledger.store import Ledger
from imgcover.report.headline import headline
from imgcover.report.index_page import lead
from imgcover.request import read_options


@dataclass(frozen=True, slots=True, kw_only=True)
class AuditAsked:
    """What the command line asked for.

    Parameters
    ----------
    folder : Path
    articles, out, ledger : Path or None
    words : mapping of str to str
        Options for every picture, as `imgcover.request.read_options` takes them.
    jobs : int or None
    time_limit : float
        Seconds a picture.
    cluster : str or None
    cluster_tls : Path or None
    cluster_send : {"bytes", "path"}
    watch, fresh : bool
    """

    folder: Path
    articles: Path | None
    out: Path | None
    ledger: Path | None
    words: Mapping[str, str]
    jobs: int | None
    time_limit: float
    cluster: str | None
    cluster_tls: Path | None
    cluster_send: Literal["bytes", "path"]
    watch: bool
    fresh: bool


def audited(asked: AuditAsked) -> ExitCode:
    """Audit the folder, once or for as long as it is watched, and say how it ended."""
    risk = read_options(asked.words).risk
    root = asked.out or Path(f"{asked.folder.resolve().name or 'folder'}-audit")
    if asked.articles is not None and not asked.articles.is_dir():
        raise OptionError("--articles", f"{asked.articles} is no folder", "name a folder")
    _refuse_goods(root, asked.folder)
    listing = None if asked.watch else _listed(asked, root)
    out = OutFolder(root)
    with ExitStack() as stack:
        ledger = stack.enter_context(Ledger.open(asked.ledger or out.ledger))
        if ledger.moved_from is not None:
            tell(f"the ledger was of an older version; its copy is {ledger.moved_from}")
        pages = stack.enter_context(
            LocalCrew(hands=asked.jobs or jobs_that_fit(), limit_s=asked.time_limit)
        )
        crew = _cluster(asked, stack) if asked.cluster else pages
        audit = Audit(asked, out, ledger, crew, pages, risk)
        if listing is not None:
            return audit.round(listing)
        return _watched(audit, asked, out)


class Audit:
    """What stays the same from round to round.

    Parameters
    ----------
    asked : AuditAsked
    out : OutFolder
    ledger : Ledger
    crew, pages : Crew
        Who measures, and who writes the lots' pages.
    risk : float or None
    """

    def __init__(
        self,
        asked: AuditAsked,
        out: OutFolder,
        ledger: Ledger,
        crew: Crew,
        pages: Crew,
        risk: float | None,
    ) -> None:
        self._asked = asked
        self._out = out
        self._ledger = ledger
        self._crew = crew
        self._pages = pages
        self._risk = risk
        self._digests = Digests()
        self._fresh = asked.fresh
        self._drawn: dict[str, int] = {}

    def round(self, listing: Listing) -> ExitCode:
        """Measure what is new, sum all lots, write all reports."""
        asked = self._asked
        bases = [asked.folder, *([asked.articles] if asked.articles else [])]
        round_ = Round(
            listing=listing,
            book=OrderBook(Grounds.of(bases), defaults=asked.words, versions=_versions()),
            folder=asked.folder.resolve().name,
            ledger=self._ledger,
            out=self._out,
            digests=self._digests,
            fresh=self._fresh,
            send=asked.cluster is not None and asked.cluster_send == "bytes",
        )
        how = self._measured(round_)
        # only the first round starts over; the next ones go on from it
        self._fresh = False
        for fault in round_.book.faults:
            tell(f"imgcover: {fault}")
        lots = list(sum_lots(round_, risk=self._risk))
        head = write_reports(round_, lots, self._pages, drawn=self._drawn)
        self._tell(round_, lots, how)
        tell(f"reports in {self._out.root}; ledger head {head}")
        codes = [_code(round_, lot) for lot in lots]
        codes += [ExitCode.USAGE] if round_.book.faults or how[How.REFUSED] else []
        codes += [ExitCode.BUG] if how[How.LOST] and self._bugs else []
        return gravest(codes)

    def _measured(self, round_: Round) -> Counter[How]:
        how: Counter[How] = Counter()
        self._bugs = 0
        every = len(round_.listing.pictures)
        with Progress(every) as progress:
            try:
                for told in measure_all(round_, self._crew, work=measure_one):
                    how[told.how] += 1
                    self._bugs += told.is_bug
                    progress.step(measured=told.how is not How.KNOWN)
                    if told.said:
                        progress.say(f"{_name(round_, told)}: {_last_line(told.said)}")
            except KeyboardInterrupt:
                kept = f"{sum(how.values())} of {_pictures(every)} are in the ledger"
                progress.say(f"{kept}; the same command goes on from there")
                raise
        return how

    def _tell(self, round_: Round, lots: list[ToldLot], how: Counter[How]) -> None:
        with opened(None, encoding=None) as write:
            for lot in lots:
                write(headline(lot.record(round_.ledger), units=lot.units) + "\n")
        for note in (*round_.listing.notes, *older_pages(round_, lots)):
            tell(note)
        counts = {How.MEASURED: "measured", How.KNOWN: "known from before"}
        counts |= {How.UNREAD: "could not be read", How.LOST: "lost", How.REFUSED: "refused"}
        said = ", ".join(f"{how[each]} {word}" for each, word in counts.items() if how[each])
        tell(f"{_pictures(len(round_.listing.pictures))}: {said}")
        tell(lead(Counter(lot.decision for lot in lots)))


def _watched(audit: Audit, asked: AuditAsked, out: OutFolder) -> ExitCode:
    """Go round whenever something came or changed; ends with Ctrl-C."""
    settling = Settling()
    done: tuple[object, ...] | None = None
    complaint = ""
    folders = [asked.folder, *([asked.articles] if asked.articles else [])]
    own = [out.root, *([asked.ledger] if asked.ledger else [])]
    tell(f"watching {asked.folder}; Ctrl-C ends it")
    for _ in looks(folders, left_out=own):
        try:
            listing, waiting = settling.split(_listed(asked, out.root))
        except LotSheetError as fault:
            # an empty folder, or a sheet that is being edited: it may be right a moment later
            if str(fault) != complaint:
                complaint = str(fault)
                tell(f"imgcover: {fault}")
            continue
        complaint = ""
        sheets = [asked.folder / listing.sheet] if listing.sheet else []
        now = signature(listing, sheets)
        if now != done and listing.pictures:
            audit.round(listing)
            done = now
            still = f"; not there or not whole yet: {_pictures(waiting)}" if waiting else ""
            tell(f"waiting for pictures{still}")
    return ExitCode.CONFORMS


def _listed(asked: AuditAsked, root: Path) -> Listing:
    return list_folder(asked.folder, articles=asked.articles, left_out=[root])


def _refuse_goods(root: Path, folder: Path) -> None:
    """Keep reports from taking the place of a lot sheet, or of anyone else's report."""
    if root.resolve() == folder.resolve():
        raise OptionError("--out", f"{root} is the audited folder itself", "name another folder")
    others = foreign(root)
    if others:
        raise OptionError(
            "--out", f"{root} holds {others[0]} that no audit wrote", "name another folder"
        )


def _cluster(asked: AuditAsked, stack: ExitStack) -> Crew:
    from imgcover.audit.cluster import ClusterCrew

    assert asked.cluster is not None
    crew = ClusterCrew(
        asked.cluster, limit_s=asked.time_limit, certificates=asked.cluster_tls, alike=_versions
    )
    sent = "as bytes" if asked.cluster_send == "bytes" else "by their path on a shared disk"
    tell(f"pictures travel to the cluster {sent}")
    return stack.enter_context(crew)


def _code(round_: Round, lot: ToldLot) -> ExitCode:
    """As the lot decides; pictures that gave nothing leave it open where places are missing."""
    code = code_of(lot.record(round_.ledger))
    short = lot.unread > 0 and lot.n_places < lot.required
    return gravest([code, *([ExitCode.UNDECIDED] if short else [])])


def _name(round_: Round, told: Told) -> str:
    return round_.listing.pictures[told.index].name


def _pictures(n: int) -> str:
    return f"{n} picture{'' if n == 1 else 's'}"


def _last_line(said: str) -> str:
    return said.strip().rpartition("\n")[2]


def _versions() -> dict[str, str]:
    return {"imgcover": __version__, **library_versions()}


__all__ = ["Audit", "AuditAsked", "audited"]
