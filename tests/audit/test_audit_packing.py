"""Truth is the same order measured where all its files lie: packed, it needs none of them."""

from datetime import date, timedelta

import numpy as np
from audit_rig import certified, lay
from PIL import Image

from imgcover.audit.folder import list_folder
from imgcover.audit.grounds import Grounds
from imgcover.audit.orders import OrderBook
from imgcover.audit.packing import packed
from imgcover.audit.work import measure_one
from imgcover.request import Enclosed

COLUMNS = "pitch\n", "device,light,blank,dark\n"
CELLS = "24px/mm", "bench.toml,backlit,blank.png,dark.png"


def test_a_packed_order_is_measured_without_any_of_its_files(tmp_path):
    today = date.today()
    lay(tmp_path, {"A": 1}, side=300)
    certified(tmp_path, pitch=24.0, made=today, valid_until=today + timedelta(100))
    for name, level in (("blank.png", 245), ("dark.png", 2)):
        Image.fromarray(np.full((300, 300), level, np.uint8)).save(tmp_path / name)
    sheet = tmp_path / "lots.csv"
    sheet.write_text(sheet.read_text().replace(*COLUMNS).replace(*CELLS))
    book = OrderBook(Grounds.of([tmp_path]), defaults={}, versions={})
    order = book.order(list_folder(tmp_path, articles=None).pictures[0])
    here = measure_one(order)
    sent = packed(order)
    assert all(
        isinstance(each, Enclosed)
        for each in (sent.options.blank, sent.options.dark, sent.options.device)
    )
    assert book.key(sent, here.picture_sha256) == book.key(order, here.picture_sha256)
    for name in ("A-1.png", "blank.png", "dark.png", "bench.toml"):
        (tmp_path / name).unlink()
    # what was measured stays the same to the byte, and the exposures were used
    assert measure_one(sent).body == here.body
    assert '"blank":"' in here.body and '"dark":"' in here.body and '"device":"' in here.body


def test_what_cannot_be_read_travels_by_name_and_is_said(tmp_path):
    lay(tmp_path, {"A": 1}, side=300)
    sheet = tmp_path / "lots.csv"
    (tmp_path / "blank.png").write_bytes(b"no picture")
    sheet.write_text(
        sheet.read_text().replace("pitch\n", "pitch,blank\n").replace("/mm", "/mm,blank.png")
    )
    book = OrderBook(Grounds.of([tmp_path]), defaults={}, versions={})
    order = book.order(list_folder(tmp_path, articles=None).pictures[0])
    assert measure_one(packed(order)).refused == measure_one(order).refused
    (tmp_path / "blank.png").unlink()
    assert "blank.png" in measure_one(packed(order)).refused
