"""Remarks on the nodes of a run, and what each node is: codes and their words."""

from __future__ import annotations

from enum import IntFlag
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from .constants import G
from .friction import RE_LAMINAR, RE_TURBULENT
from .runflow import Flow, RunStart
from .runshape import Array, Geometry

Codes = npt.NDArray[np.int64]

ROUNDING: Final = 1e-12
"""A pressure this little below ambient, against the heads it came from, is ambient."""

STRAIGHT: Final = 1e-9
"""A deflection below this [rad] is rounding of the coordinates."""


class Note(IntFlag):
    """Remarks on a node, as bits; :func:`note_text` words them."""

    SEPARATION = 1
    SUBATMOSPHERIC = 2
    FAST = 4
    TRANSITION = 8
    REVERSE = 16
    SHARP = 32
    OFFTAKE = 64
    JOINT = 128


NOTE_TEXT: Final[dict[Note, str]] = {
    Note.OFFTAKE: "thrust not found: the offtake needs a direction and a diameter",
    Note.JOINT: "thrust not found: joint diameter smaller than the bore",
    Note.SEPARATION: "pressure at or below vapour pressure: the column separates, results do not hold",
    Note.SUBATMOSPHERIC: "pressure below ambient",
    Note.FAST: "velocity above usual practice",
    Note.TRANSITION: "flow between laminar and turbulent: friction uncertain",
    Note.REVERSE: "flow against the order of the nodes",
    Note.SHARP: "deflection above 90 deg: check the coordinates",
}
FAULTS: Final = int(Note.OFFTAKE | Note.JOINT)
"""The notes of a node whose thrust could not be found."""


class Fitting(IntFlag):
    """What a node is, as bits, from geometry and table alone."""

    BEND = 1
    REDUCER = 2
    TEE = 4
    PUMP = 8
    LOSS = 16
    CAP = 32
    JET = 64


FITTING_TEXT: Final[dict[Fitting, str]] = {
    Fitting.BEND: "bend",
    Fitting.REDUCER: "reducer",
    Fitting.TEE: "tee",
    Fitting.PUMP: "pump",
    Fitting.LOSS: "loss",
    Fitting.CAP: "cap",
    Fitting.JET: "jet",
}


def notes(geometry: Geometry, start: RunStart, flow: Flow, p1: Array, p2: Array, po: Array) -> Codes:
    """The notes on every node."""
    fast1, fast2 = np.abs(flow.V1) > start.Vmax, np.abs(flow.V2) > start.Vmax
    if geometry.end == "jet":
        fast2[-1] = False  # a jet is meant to be fast
    between = np.append((flow.Re > RE_LAMINAR) & (flow.Re < RE_TURBULENT), False)
    lowest = np.minimum(np.where(geometry.offtake, po, np.inf), np.minimum(p1, p2))
    # Rounding of the head must not turn ambient pressure into less.
    slack = ROUNDING * (np.abs(p1) + start.rho * G * (np.abs(flow.EGL1) + np.abs(geometry.z)))
    code = np.zeros(geometry.size, dtype=np.int64)
    for condition, note in (
        ((lowest + start.pamb <= start.pv) & (flow.rho > 0), Note.SEPARATION),
        (lowest < -slack, Note.SUBATMOSPHERIC),
        (fast1 | fast2, Note.FAST),
        (between & np.isnan(geometry.f), Note.TRANSITION),
        ((flow.Q1 < 0) | (flow.Q2 < 0), Note.REVERSE),
        (geometry.theta > np.pi / 2 + STRAIGHT, Note.SHARP),
        (geometry.offtake_fault, Note.OFFTAKE),
        (geometry.joint_fault, Note.JOINT),
    ):
        code[condition] |= int(note)
    return code


def fittings(geometry: Geometry) -> Codes:
    """What every node is."""
    code = np.zeros(geometry.size, dtype=np.int64)
    last = np.arange(geometry.size) == geometry.size - 1
    ends = np.zeros(geometry.size, dtype=bool)
    ends[0], ends[-1] = geometry.start == "closed", geometry.end == "closed"
    jet = last & (geometry.end == "jet")
    for condition, fitting in (
        (geometry.theta > STRAIGHT, Fitting.BEND),
        ((geometry.D1 != geometry.D2) & ~ends & ~jet, Fitting.REDUCER),
        (geometry.offtake, Fitting.TEE),
        (geometry.Hp != 0, Fitting.PUMP),
        ((geometry.K > 0) & (geometry.theta <= STRAIGHT) & (geometry.D1 == geometry.D2), Fitting.LOSS),
        (ends, Fitting.CAP),
        (jet, Fitting.JET),
    ):
        code[condition] |= int(fitting)
    return code


def _words(code: int, texts: dict[Any, str], separator: str) -> str:
    return separator.join(text for bit, text in texts.items() if code & int(bit))


def note_text(code: int) -> str:
    """Word the note of a node; "ok" where there is nothing to say."""
    return _words(int(code), NOTE_TEXT, "; ") or "ok"


def fitting_text(code: int) -> str:
    """Word what a node is; "straight" where nothing happens."""
    return _words(int(code), FITTING_TEXT, ", ") or "straight"
