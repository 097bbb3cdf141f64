"""Truth is the folder as the test laid it: nothing is read outside, nothing is passed over."""

import os
import time

import pytest

from imgcover.audit.folder import list_folder
from imgcover.audit.grounds import Grounds, OffGroundsError, read_file
from imgcover.errors import LotSheetError

ARTICLE = """
[article]
code = "{}"
[warp]
threads = "68 /in"
count = "32 Ne"
[weft]
threads = "64 /in"
count = "32 Ne"
"""


def lay(root, *names, content=b"x"):
    for name in names:
        path = root / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(content)


def names(listing):
    return [picture.name for picture in listing.pictures]


def test_a_sub_folder_is_a_lot_and_its_article_toml_the_declaration(tmp_path):
    lay(tmp_path, "B/2.png", "B/10.png", "B/deep/1.tif", "A/1.jpg", "A/notes.txt", "A/.hidden.png")
    lay(tmp_path, "B/article.toml", "B/Thumbs.db")
    listing = list_folder(tmp_path, articles=None)
    assert names(listing) == ["A/1.jpg", "B/2.png", "B/10.png", "B/deep/1.tif"]
    assert [p.lot for p in listing.pictures] == ["A", "B", "B", "B"]
    assert listing.pictures[0].article is None
    assert {p.article for p in listing.pictures[1:]} == {tmp_path / "B" / "article.toml"}
    assert list(listing.lots().values()) == [[0], [1, 2, 3]]


def test_two_articles_under_one_lot_are_two_lots(tmp_path):
    lay(tmp_path, "1.png", "2.png", "3.png")
    lay(tmp_path, "h.toml", "g.toml", content=ARTICLE.format("x").encode())
    sheet(tmp_path, "1.png,7,h", "2.png,7,g", "3.png,7,h")
    lots = list_folder(tmp_path, articles=None).lots()
    assert {(lot.lot, lot.article.name): at for lot, at in lots.items()} == {
        ("7", "h.toml"): [0, 2],
        ("7", "g.toml"): [1],
    }


def test_a_picture_under_a_wrong_name_is_not_passed_over(tmp_path):
    lay(tmp_path, "A/scan.heic", "A/scan", "A/scan.zip", "A/scan.PNG")
    assert len(names(list_folder(tmp_path, articles=None))) == 4


def test_where_the_audit_writes_is_not_listed(tmp_path):
    lay(tmp_path, "A/1.png", "out/lots/thumb.png")
    listing = list_folder(tmp_path, articles=None, left_out=[tmp_path / "out"])
    assert names(listing) == ["A/1.png"]


def test_a_sheet_says_what_is_measured_and_what_was_left_lying(tmp_path):
    lay(tmp_path, "scans/1.png", "scans/2.png", "scans/blank.png", "scans/other.dat")
    (tmp_path / "lots.csv").write_text(
        "picture,lot,place,pitch,blank\nscans/1.png,7,3,600dpi,scans/blank.png\n"
    )
    listing = list_folder(tmp_path, articles=None)
    (picture,) = listing.pictures
    assert picture.path == tmp_path / "scans" / "1.png"
    assert picture.sample == {"lot": "7", "place": "3"}
    assert picture.options == {"pitch": "600dpi", "blank": "scans/blank.png"}
    assert listing.unlisted == ("scans/2.png",)
    assert listing.sheet == "lots.csv"
    assert listing.notes == ["in the folder but not in lots.csv: scans/2.png"]


def test_a_table_that_is_no_lot_sheet_by_its_name_is_not_passed_over_in_silence(tmp_path):
    lay(tmp_path, "scans/1.png", "Lot list.xlsx", "scans/inner.csv")
    listing = list_folder(tmp_path, articles=None)
    assert [picture.lot for picture in listing.pictures] == ["scans"]
    (note,) = listing.notes
    assert "sub-folders were taken for lots" in note and note.endswith(": Lot list.xlsx")


def sheet(tmp_path, *rows, head="picture,lot,article"):
    (tmp_path / "lots.csv").write_text("\n".join([head, *rows]) + "\n")


def test_an_article_is_found_by_path_name_folder_or_code(tmp_path):
    outside = tmp_path / "papers"
    root = tmp_path / "goods"
    lay(root, "1.png", "2.png", "3.png", "4.png", "5.png")
    lay(root, "articles/harrow.toml", content=ARTICLE.format("H-1").encode())
    lay(outside, "stook/article.toml", "fallow.toml", content=ARTICLE.format("F-2").encode())
    rows = ["1.png,7,articles/harrow.toml", "2.png,7,harrow", "3.png,7,H-1", "4.png,7,stook"]
    sheet(root, *rows, "5.png,7,F-2")
    found = [p.article for p in list_folder(root, articles=outside).pictures]
    harrow = root / "articles" / "harrow.toml"
    assert found == [harrow] * 3 + [outside / "stook" / "article.toml", outside / "fallow.toml"]


@pytest.mark.parametrize(
    ("named", "said"),
    [
        ("harow", 'no declaration "harow"; nearest: "harrow"'),
        ("../secret.toml", "leads out"),
        ("/etc/passwd", "leads out"),
        ("H-1", 'declare "H-1"'),
    ],
)
def test_an_article_that_is_not_there_is_refused(tmp_path, named, said):
    root = tmp_path / "goods"
    lay(tmp_path, "secret.toml")
    lay(root, "harrow.toml", "other.toml", content=ARTICLE.format("H-1").encode())
    sheet(root, f"1.png,7,{named}")
    with pytest.raises(LotSheetError) as refused:
        list_folder(root, articles=None)
    assert said in str(refused.value) and "lots.csv row 2, article" in str(refused.value)


def test_a_picture_listed_twice_is_refused_however_it_is_spelled(tmp_path):
    lay(tmp_path, "1.png")
    sheet(tmp_path, "1.png,7", "./1.png,7", head="picture,lot")
    with pytest.raises(LotSheetError, match="row 2 lists it too"):
        list_folder(tmp_path, articles=None)


def test_names_that_lead_out_are_told_not_followed(tmp_path):
    root = tmp_path / "goods"
    lay(tmp_path, "secret.png")
    lay(root, "A/1.png")
    (root / "A" / "2.png").symlink_to(tmp_path / "secret.png")
    (root / "A" / "3.png").symlink_to(root / "A" / "1.png")
    (root / "A" / "4.png").symlink_to(root / "A" / "4.png")
    (root / "A" / "5").symlink_to(tmp_path)
    faults = {p.name: (p.fault, p.path) for p in list_folder(root, articles=None).pictures}
    assert faults["A/2.png"] == ("it leads out of the audited folder", None)
    assert faults["A/5"] == ("it leads out of the audited folder", None)
    assert faults["A/3.png"] == ("", root / "A" / "1.png")
    with pytest.raises(OffGroundsError):
        read_file(faults["A/4.png"][1])
    sheet(root, "../secret.png,7", "/dev/zero,7", head="picture,lot")
    assert [p.path for p in list_folder(root, articles=None).pictures] == [None, None]


def test_pipes_folders_and_the_missing_are_refused_at_once(tmp_path):
    os.mkfifo(tmp_path / "pipe")
    (tmp_path / "folder").mkdir()
    begun = time.monotonic()
    for name, said in (("pipe", "a pipe"), ("folder", "a folder"), ("none", "no such file")):
        with pytest.raises(OffGroundsError, match=said):
            read_file(tmp_path / name)
    assert time.monotonic() - begun < 1


def test_a_file_larger_than_any_picture_is_refused_before_it_is_read(tmp_path):
    with (tmp_path / "huge.png").open("wb") as file:
        file.truncate(10**12)
    with pytest.raises(OffGroundsError, match="larger than 4000 MB"):
        read_file(tmp_path / "huge.png")


def test_back_slashes_of_another_system_are_understood(tmp_path):
    lay(tmp_path, "scans/1.png")
    grounds = Grounds.of([tmp_path])
    assert grounds.resolve("scans\\1.png") == tmp_path / "scans" / "1.png"
    lay(tmp_path, "scans\\1.png")
    assert grounds.resolve("scans\\1.png") == tmp_path / "scans\\1.png"


def test_accents_composed_another_way_name_the_same_file(tmp_path):
    """Truth is Unicode's annex 15: ö is one character or an o and a mark, and looks the same."""
    lay(tmp_path, "Mo\u0308we.png", "M\u00f6wen.png")
    sheet(tmp_path, "M\u00f6we.png,1", "Mo\u0308wen.png,1", head="picture,lot")
    listing = list_folder(tmp_path, articles=None)
    assert [picture.path.is_file() for picture in listing.pictures] == [True, True]
    assert listing.unlisted == ()


def test_strange_names_become_plain_text(tmp_path):
    lay(tmp_path, "A/a\nb.png", "A/\x1b[2J.png")
    (tmp_path / "A" / os.fsdecode(b"\xff.png")).write_bytes(b"x")
    told = names(list_folder(tmp_path, articles=None))
    assert sorted(told) == ["A/\\x1b[2J.png", "A/\\xff.png", "A/a\\nb.png"]


def test_an_empty_folder_and_no_folder_are_refused(tmp_path):
    with pytest.raises(LotSheetError, match="holds no picture"):
        list_folder(tmp_path, articles=None)
    with pytest.raises(LotSheetError, match="not a folder"):
        list_folder(tmp_path / "none", articles=None)


def test_a_trap_of_folders_is_not_followed_for_ever(tmp_path):
    lay(tmp_path, "/".join(["d"] * 60).lstrip("/") + "/1.png")
    (picture,) = list_folder(tmp_path, articles=None).pictures
    assert picture.name == "/".join(["d"] * 31)
