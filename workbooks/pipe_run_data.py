"""The scenario of the template ``pipe-run``: invented place, names and figures."""

from __future__ import annotations

from typing import Final

TITLE: Final = "Thrust on a pumped raw-water main"

START: Final = (
    ("rho", 999.7, "kg/m3", "density of the water, at 10 C"),
    ("mu", 1.306, "mPa s", "dynamic viscosity, at 10 C"),
    ("Q", 250.0, "L/s", "flow that enters the main"),
    ("flow_at", "start", "", "where this flow holds"),
    ("start", "continues", "", "the main goes on to the pumps"),
    ("end", "jet", "", "free outlet into the inlet chamber"),
    ("pamb", 100.1, "kPa", "ambient pressure, absolute"),
    ("pv", 1.23, "kPa", "vapour pressure of the water, absolute"),
    ("Vmax", 3.0, "m/s", "velocity above which a leg is remarked on"),
)

NODE_HEADINGS: Final = ("name", "x", "y", "z", "D", "e", "K", "Qo", "ox", "oy", "oz", "Do", "Ko", "Dj", "")
NODE_UNITS: Final = ("", "m", "m", "m", "mm", "mm", "", "L/s", "", "", "", "mm", "", "mm", "")
_N = None
NODES: Final = (
    ("N01", 0, 0, 42.0, 500, 0.1, _N, _N, _N, _N, _N, _N, _N, _N, "pump manifold"),
    ("N02", 4, 0, 42.0, 500, 0.1, 0.25, _N, _N, _N, _N, _N, _N, _N, "foot of riser"),
    ("N03", 4, 0, 45.5, 500, 0.1, 0.25, _N, _N, _N, _N, _N, _N, _N, "head of riser"),
    ("N04", 12, 0, 45.5, 500, 0.1, 0.20, _N, _N, _N, _N, _N, _N, _N, "isolating valve, open"),
    ("N05", 24, 0, 45.5, 500, 0.1, 0.15, _N, _N, _N, _N, _N, _N, _N, "yard bend, 45 deg"),
    ("N06", 64, 40, 45.5, 500, 0.1, 0.15, _N, _N, _N, _N, _N, _N, _N, "bend to north"),
    ("N07", 64, 160, 46.5, 500, 0.1, 0.05, _N, _N, _N, _N, _N, _N, _N, "vertical bend"),
    ("N08", 64, 240, 52.0, 500, 0.1, 0.10, _N, _N, _N, _N, _N, _N, _N, "before stream"),
    ("N09", 64, 262, 47.0, 500, 0.1, 0.10, _N, _N, _N, _N, _N, _N, _N, "stream crossing"),
    ("N10", 64, 276, 47.0, 500, 0.1, 0.10, _N, _N, _N, _N, _N, _N, _N, "stream crossing"),
    ("N11", 64, 298, 53.5, 500, 0.1, 0.10, _N, _N, _N, _N, _N, _N, _N, "after stream"),
    ("N12", 64, 420, 58.0, 500, 0.1, 0.10, _N, _N, _N, _N, _N, _N, _N, "field bend"),
    ("N13", 24, 500, 60.0, 500, 0.1, 0.10, _N, _N, _N, _N, _N, _N, _N, "field bend"),
    ("N14", 24, 620, 66.0, 500, 0.1, 0.10, 60, -1, 0, 0, 250, 0.9, _N, "tee to the farm supply"),
    ("N15", 24, 640, 67.0, 400, 0.1, 0.10, _N, _N, _N, _N, _N, _N, _N, "reducer 500 x 400"),
    ("N16", 24, 680, 69.0, 400, 0.1, _N, 0, 1, 0, 0, 200, _N, _N, "blank branch, for later"),
    ("N17", 24, 760, 73.0, 400, 0.1, 0.15, _N, _N, _N, _N, _N, _N, _N, "lane bend"),
    ("N18", 94, 830, 75.0, 400, 0.1, 0.15, _N, _N, _N, _N, _N, _N, _N, "lane bend"),
    ("N19", 194, 830, 80.0, 400, 0.1, 0.10, _N, _N, _N, _N, _N, _N, _N, "vertical bend"),
    ("N20", 260, 830, 80.0, 400, 0.1, 2.50, _N, _N, _N, _N, _N, _N, _N, "control valve"),
    ("N21", 300, 830, 80.0, 400, 0.1, 0.15, _N, _N, _N, _N, _N, _N, _N, "works road"),
    ("N22", 340, 870, 84.0, 400, 0.1, 0.15, _N, _N, _N, _N, _N, _N, _N, "vertical bend"),
    ("N23", 356, 886, 91.5, 400, 0.1, 0.20, _N, _N, _N, _N, _N, _N, _N, "head of inlet riser"),
    ("N24", 362, 892, 91.5, 300, _N, _N, _N, _N, _N, _N, _N, _N, _N, "outlet nozzle, 300 mm"),
)

CASE_HEADINGS: Final = ("case", "kind", "p [kPa]", "H [m]", "dp [kPa]", "dp2 [kPa]", "")
CASES: Final = (
    ("operating", "operating", _N, _N, _N, _N, "pumps on, control valve open"),
    ("shut valve", "shut", _N, 118, _N, _N, "outlet shut, pumps at their shut-off head"),
    ("test", "test", 1200, _N, _N, _N, "hydrostatic test, gauge at the lowest node"),
    ("surge", "surge", _N, _N, 250, 60, "pumps trip and restart; from a surge study, here invented"),
)
