"""CODATA 2022 values for tests/model_quantities.rs, out of scipy.constants (scipy 1.15 or later).

Run: python3 constants.py > constants.csv
"""
import scipy.constants as sc

ROWS = [
    "Planck constant",
    "reduced Planck constant",
    "electron mass",
    "elementary charge",
    "Bohr radius",
    "Hartree energy",
    "Rydberg constant times hc in J",
    "Boltzmann constant",
    "atomic mass constant",
    "speed of light in vacuum",
]

assert sc.value("electron mass") == 9.1093837139e-31, "not CODATA 2022"
print("# CODATA 2022, as tabulated in scipy.constants")
for name in ROWS:
    value, unit, _ = sc.physical_constants[name]
    print(f"{name},{value!r},{unit}")
