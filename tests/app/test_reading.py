"""Reading an upload: in a child, within limits, refusals intact."""

import io
import time
from dataclasses import replace

import pandas as pd
import pytest

import engine
from app.reading import TooLarge, read_upload
from engine.records import read_frame
from engine.refusal import Refusal

CSV = "age,shift,passed\n" + "".join(f"{20 + row % 30},{'days' if row % 3 else 'nights'},yes\n" for row in range(50))


def left(settings):
    return list((settings.data / "incoming").iterdir())


def test_a_file_is_read_as_it_would_be_in_this_process(settings):
    frame, warnings = read_upload(io.BytesIO(CSV.encode()), "visits.csv", settings)
    here, said = read_frame(io.BytesIO(CSV.encode()), "visits.csv")
    pd.testing.assert_frame_equal(frame, here.astype(frame.dtypes))
    assert engine.Table.from_frame(frame).digest == engine.Table.from_frame(here).digest
    assert warnings == tuple(said)
    assert left(settings) == []


@pytest.mark.parametrize("content", [b"", b"\x89PNG\r\n\x1a\n" + bytes(200), b"a,b\n1,2\n3,4,5\n", b"a,a\n1,2\n"])
def test_a_refusal_arrives_whole(settings, content):
    with pytest.raises(Refusal) as here:
        read_frame(io.BytesIO(content), "bad.csv")
    with pytest.raises(Refusal) as there:
        read_upload(io.BytesIO(content), "bad.csv", settings)
    assert (there.value.message, there.value.where, there.value.do) == (
        here.value.message,
        here.value.where,
        here.value.do,
    )
    assert left(settings) == []


def test_a_file_over_the_limit_is_refused_with_the_limit(settings):
    with pytest.raises(TooLarge, match="larger than 1 MB"):
        read_upload(io.BytesIO(b"a,b\n" * 400_000), "big.csv", replace(settings, upload_limit=1))
    assert left(settings) == []


def test_a_file_that_takes_too_much_memory_is_refused_and_the_server_lives(settings):
    wide = ("a,b\n" + "x" * 60 + ",y\n") + "".join(f"{row}{'x' * 50},{row}{'y' * 50}\n" for row in range(400_000))
    with pytest.raises(Refusal, match="more memory than it may"):
        read_upload(io.BytesIO(wide.encode()), "wide.csv", replace(settings, reading_memory=50))
    assert left(settings) == []
    assert len(read_upload(io.BytesIO(CSV.encode()), "visits.csv", settings)[0]) == 50


def test_a_file_that_takes_too_long_is_refused_in_time(settings, monkeypatch):
    from app import workers
    from tests.app import slow_reading

    monkeypatch.setattr(workers, "parse_upload", slow_reading.waits)
    began = time.monotonic()
    with pytest.raises(Refusal, match="took more than 1 seconds"):
        read_upload(io.BytesIO(CSV.encode()), "slow.csv", replace(settings, reading_time=1))
    assert time.monotonic() - began < 30
    assert left(settings) == []


def test_a_reader_that_is_killed_is_a_refusal(settings, monkeypatch):
    from app import workers
    from tests.app import slow_reading

    monkeypatch.setattr(workers, "parse_upload", slow_reading.dies)
    with pytest.raises(Refusal, match="was stopped"):
        read_upload(io.BytesIO(CSV.encode()), "visits.csv", settings)
