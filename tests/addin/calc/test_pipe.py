"""The pipe between the office and the worker: what crosses it, and what happens when it breaks."""

from __future__ import annotations

import io
import math
import os
import signal
import sys
import time
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from thrustbook.addin import dispatch
from thrustbook.addin.cells import ERROR_TEXT, CellError
from thrustbook.addin.hosts.calc import worker
from thrustbook.addin.hosts.calc.office import link, wire
from thrustbook.addin.tables import LongTable

TEXT = st.text(st.characters(exclude_characters="\0"), max_size=20)
SCALAR = st.one_of(st.floats(allow_nan=False), TEXT, st.none())
CELL = st.one_of(SCALAR, st.booleans())


@st.composite
def grids(draw: st.DrawFn) -> tuple[tuple[Any, ...], ...]:
    width, height = draw(st.integers(1, 4)), draw(st.integers(1, 12))
    kinds = draw(
        st.lists(st.sampled_from([st.floats(allow_nan=False), TEXT, SCALAR]), min_size=width, max_size=width)
    )
    return tuple(tuple(draw(kind) for kind in kinds) for _ in range(height))


def there_and_back(value: Any) -> Any:
    data = wire.pack(value)
    found, end = wire.unpack(data, 0, wire.read_rows)
    assert end == len(data)
    return found


@given(CELL)
def test_a_cell_crosses_unchanged(value: Any) -> None:
    found = there_and_back(value)
    assert type(found) is type(value)
    assert found == value


@given(grids())
def test_a_range_crosses_unchanged(rows: Any) -> None:
    found = there_and_back(rows)
    assert found == rows
    assert [[type(v) for v in line] for line in found] == [[type(v) for v in line] for line in rows]


@given(st.lists(st.one_of(CELL, grids()), max_size=5))
def test_a_call_crosses_unchanged(args: list[Any]) -> None:
    name, found = wire.unpack_call(wire.pack_call("TB_AREA", args), wire.read_rows)
    assert (name, found) == ("TB_AREA", args)


@pytest.mark.parametrize("kind", ERROR_TEXT)
def test_an_error_is_the_offices_own_number(kind: Any) -> None:
    (value,) = there_and_back(((wire.error_number(wire.ERROR_CODES[kind]),),))[0]
    assert math.isnan(value)
    assert wire.error_code(value) == wire.ERROR_CODES[kind]
    packed = worker.pack(CellError(kind))
    found, _ = wire.unpack(packed, 0, wire.read_rows)
    assert wire.error_code(found) == wire.ERROR_CODES[kind]


def test_an_array_of_results_with_errors_and_texts() -> None:
    grid = np.array([[1.5, "a", CellError("NUM")], [CellError("NA"), "", np.float64(2.0)]], dtype=object)
    rows, _ = wire.unpack(worker.pack(grid), 0, wire.read_rows)
    assert rows[0][:2] == (1.5, "a")
    assert wire.error_code(rows[0][2]) == wire.ERROR_CODES["NUM"]
    assert wire.error_code(rows[1][0]) == wire.ERROR_CODES["NA"]
    assert rows[1][1:] == ("", 2.0)


def test_half_a_frame_is_the_end() -> None:
    with pytest.raises(wire.Closed):
        wire.receive(io.BytesIO(b"\x05\x00\x00\x00abc"))
    with pytest.raises(wire.Closed):
        wire.receive(io.BytesIO(b"\xff\xff\xff\xff" + bytes(20)))


def test_a_long_table_gives_what_a_short_one_gives() -> None:
    """Empty cells of a range arrive as empty text, and a long range is read another way."""
    kinds = (("bend", 300.0, 90.0), ("closed", 200.0, ""), ("", "", ""))
    headings = (("fitting", "D1", "theta", "rho", "p1", "Q"),)
    rows = tuple((*line, 1000.0, 400.0, 100.0 if line[0] == "bend" else "") for line in kinds)
    rows = (*rows[:2], ("", "", "", "", "", ""))

    def told(table: Any) -> list[Any]:
        request = wire.pack_call("TB_SCHEDULE", ("Fx,Fy,F,note", "metric", headings, table))
        found, _ = wire.unpack(worker.answer(request), 0, wire.read_rows)
        return [tuple(found[i]) for i in range(len(table))]

    short = told(rows)
    assert short[0][2] > 0
    assert short[2] == ("", "", "", "")
    many = told(rows * 200)
    assert many == short * 200
    assert type(worker._read_range(wire.pack(rows * 200))) is LongTable
    areas = worker.answer(wire.pack_call("TB_AREA", ("SI", tuple((1.0,) for _ in range(2000)))))
    assert wire.unpack(areas, 0, wire.read_rows)[0] == ((math.pi / 4,),) * 2000


def test_zeros_that_stand_for_empty_cells() -> None:
    assert worker.arguments("TB_AREA", [0.0, 0.3]) == [None, 0.3]
    assert worker.arguments("TB_AREA", [0.0, 0.0]) == [None, 0.0]
    assert worker.arguments("TB_WHY", ["tb_area", 0.0, 0.0]) == ["tb_area", None, 0.0]
    assert worker.arguments("TB_WORKING", ["TB_AREA", 0.0, 300.0]) == ["TB_AREA", None, 300.0]
    units = [["diameter", "mm"]]
    assert worker.arguments("TB_AREA", [units, 300.0]) == [units, 300.0]
    (error,) = worker.arguments("TB_VERSION", [wire.error_number(wire.ERROR_CODES["DIV0"])])
    assert error == CellError("DIV0")


@pytest.fixture
def caller() -> Iterator[tuple[link.Link, link.Caller]]:
    made = link.Link(link.worker_command(sys.executable))
    yield made, link.Caller(made)
    made.close()


def test_worker_starts_on_first_use_and_is_kept(caller: tuple[link.Link, link.Caller]) -> None:
    made, calls = caller
    assert made.pid is None
    expected = dispatch.call("TB_AREA", ["metric", 300.0])
    assert calls.rows("TB_AREA", ("metric", 300.0)) == ((expected,),)
    pid = made.pid
    assert calls.value("TB_AREA", ("metric", 300.0)) == expected
    assert calls.rows("TB_AREA", ("metric", ((300.0,), (300.0,)))) == ((expected,), (expected,))
    assert made.pid == pid
    assert made.started == 1


def test_dead_worker_is_started_again(caller: tuple[link.Link, link.Caller]) -> None:
    made, calls = caller
    for started in (1, 2, 3):
        assert calls.value("TB_WHY", ("TB_AREA", "SI", 1.0)) == "ok"
        assert made.started == started
        assert made.pid is not None
        os.kill(made.pid, signal.SIGKILL)


def _fails(command: list[str], reason: str) -> link.Link:
    made = link.Link(command)
    calls = link.Caller(made)
    (value,) = calls.rows("TB_AREA", ("SI", 1.0))[0]
    assert wire.error_code(value) == wire.ERROR_CODES["VALUE"]
    assert reason in calls.value("TB_WHY", ("TB_AREA", "SI", 1.0))
    return made


def test_worker_that_cannot_start_is_told_and_not_tried_for_every_cell(tmp_path: Path) -> None:
    _fails([str(tmp_path / "no-python")], "no-python cannot be started")
    made = _fails([sys.executable, "-c", "raise SystemExit('broken here')"], "broken here")
    assert made.started == 1


def test_worker_that_dies_at_every_call_is_restarted_once_a_call() -> None:
    dying = (
        "import sys; from thrustbook.addin.hosts.calc.office import wire\n"
        "wire.send(sys.stdout.buffer, b'thrustbook %d' % wire.PROTOCOL)\n"
        "wire.receive(sys.stdin.buffer); print('died of this', file=sys.stderr)"
    )
    made = _fails([sys.executable, "-c", dying], "died of this")
    assert made.started == 2


def test_worker_of_another_release_is_refused() -> None:
    other = (
        "import sys; from thrustbook.addin.hosts.calc.office import wire\n"
        "wire.send(sys.stdout.buffer, b'thrustbook 0'); sys.stdin.read()"
    )
    _fails([sys.executable, "-c", other], "run: thrustbook install calc")


def test_worker_that_hangs_is_ended(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(link, "PATIENCE", 0.5)
    hanging = (
        "import sys, time; from thrustbook.addin.hosts.calc.office import wire\n"
        "wire.send(sys.stdout.buffer, b'thrustbook %d' % wire.PROTOCOL); time.sleep(600)"
    )
    made = link.Link([sys.executable, "-c", hanging])
    assert "took longer" in link.Caller(made).value("TB_WHY", ("TB_AREA",))
    assert made.pid is None


def test_worker_ends_with_the_pipe() -> None:
    made = link.Link(link.worker_command(sys.executable))
    assert link.Caller(made).value("TB_WHY", ("TB_AREA", "SI", 1.0)) == "ok"
    process = made._process
    assert process is not None
    assert process.stdin is not None
    process.stdin.close()
    limit = time.monotonic() + 10
    while process.poll() is None and time.monotonic() < limit:
        time.sleep(0.02)
    assert process.poll() == 0
    made.close()


def test_what_a_library_prints_does_not_get_into_the_answers() -> None:
    noisy = (
        "from thrustbook.addin.hosts.calc import worker\n"
        "old = worker.answer\n"
        "def answer(request):\n    print('noise'); return old(request)\n"
        "worker.answer = answer\nworker.main()"
    )
    made = link.Link([sys.executable, "-c", noisy])
    assert link.Caller(made).value("TB_WHY", ("TB_AREA", "SI", 1.0)) == "ok"
    made.close()
