"""Packed files."""

import gzip
import io
import zipfile

import pytest

from profiles.errors import DataError
from profiles.ingest import read

TEXT = b"date,T_1m\n2031-01-01,29\n2031-01-02,28\n"


def archive(files, method=zipfile.ZIP_DEFLATED):
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w", method) as file:
        for name, content in files.items():
            file.writestr(name, content)
    return packed.getvalue()


@pytest.mark.parametrize("method", [zipfile.ZIP_STORED, zipfile.ZIP_DEFLATED, zipfile.ZIP_BZIP2, zipfile.ZIP_LZMA])
def test_the_one_file_of_an_archive_is_read(write, wide, method):
    delivery = read(write(archive({"folder/": b"", "folder/chain.csv": TEXT}, method), "TB-01.csv.zip"), wide)
    assert delivery.chain["temperature"].values[:, 0].tolist() == [29, 28]
    assert delivery.mooring == "TB-01"


def test_the_file_that_fits_the_layout_is_read(write, wide):
    path = write(archive({"notes.txt": b"read me", "a/chain.csv": TEXT}))
    layout = wide.model_copy(update={"member": "*.csv"})
    assert read(path, layout).rows_kept == 2
    with pytest.raises(DataError, match="cannot be told which file") as caught:
        read(path, wide)
    assert caught.value.found == "'notes.txt', 'a/chain.csv'"
    with pytest.raises(DataError, match="cannot be told which file") as caught:
        read(path, wide.model_copy(update={"member": "*.dat"}))
    assert "that fits '*.dat'" in caught.value.expected


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (archive({}), "is a binary file"),
        (archive({"folder/": b""}), "cannot be told which file"),
        (archive({"a.csv": b""}), "the file is empty"),
        (archive({"a.csv": TEXT})[:-30], "damaged or locked"),
        (archive({"a.csv": TEXT * 50})[:60] + b"xxxx" + archive({"a.csv": TEXT * 50})[64:], "damaged or locked"),
        (gzip.compress(TEXT)[:-4], "damaged or locked"),
        (gzip.compress(TEXT)[:15] + b"\xff\xff\xff" + gzip.compress(TEXT)[18:], "damaged or locked"),
        (gzip.compress(b""), "the file is empty"),
    ],
)
def test_archives_that_hold_nothing_or_are_damaged_are_told(write, wide, content, message):
    with pytest.raises(DataError, match=message):
        read(write(content), wide)


def test_locked_archives_are_told(write, wide):
    content = bytearray(archive({"a.csv": TEXT}, zipfile.ZIP_STORED))
    content[6] |= 1  # general purpose bit flag 0: encrypted (APPNOTE.TXT, section 4.4.4; from memory)
    content[content.index(b"PK\x01\x02") + 8] |= 1
    with pytest.raises(DataError, match="damaged or locked"):
        read(write(bytes(content)), wide)


def test_an_archive_flipped_anywhere_is_read_alike_or_told(write, wide):
    for packed in (archive({"a.csv": TEXT}), archive({"a.csv": TEXT}, zipfile.ZIP_STORED), gzip.compress(TEXT)):
        for place in range(len(packed)):
            content = bytearray(packed)
            content[place] ^= 1 << place % 8
            try:
                delivery = read(write(bytes(content)), wide)
            except DataError:
                continue
            assert delivery.rows_read == 2
            assert delivery.chain["temperature"].values[:, 0].tolist() == [29, 28]
