"""Physical constants shared by the reference scripts, and how they write their results.

CODATA 2018: q, k, h and c are exact by definition of the SI; the vacuum permittivity is measured.
"""

import json
from pathlib import Path

Q = "1.602176634e-19"  # elementary charge, C
K = "1.380649e-23"  # Boltzmann constant, J/K
H = "6.62607015e-34"  # Planck constant, J s
C = "299792458"  # speed of light, m/s
EPS0 = "8.8541878128e-12"  # vacuum permittivity, F/m

HERE = Path(__file__).resolve().parent


def write(name, data):
    """Writes `data` as JSON beside this file; the order of keys is the order of insertion."""
    text = json.dumps(data, indent=1, ensure_ascii=True)
    (HERE / name).write_text(text + "\n")


def read(name):
    """The JSON file `name` beside this file."""
    return json.loads((HERE / name).read_text())
