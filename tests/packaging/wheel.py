"""Holds the wheel and its metadata against Cargo.toml.

    python wheel.py WHEEL ROOT VENV     a virtual environment that the wheel is installed in
"""

import subprocess
import sys
import tomllib
import zipfile
from email import message_from_bytes
from pathlib import Path

wheel, root, venv = map(Path, sys.argv[1:])
cargo = tomllib.loads((root / "Cargo.toml").read_text(encoding="utf-8"))["package"]
stem = f"{cargo['name']}-{cargo['version']}"

with zipfile.ZipFile(wheel) as file:
    names = file.namelist()
    metadata = message_from_bytes(file.read(f"{stem}.dist-info/METADATA"))
programs = [name for name in names if name.startswith(f"{stem}.data/")]
assert programs == [f"{stem}.data/scripts/genewane"], programs
others = [name for name in names if name not in programs and ".dist-info/" not in name]
assert not others, f"the wheel holds more than the program: {others}"
for licence in ("LICENSE-MIT", "LICENSE-APACHE"):
    assert any(name.endswith(licence) for name in names), f"{licence} is not in the wheel"
for field, wanted in {
    "Name": cargo["name"],
    "Version": cargo["version"],
    "Summary": cargo["description"],
    "License-Expression": cargo["license"],
}.items():
    assert metadata[field] == wanted, f"{field}: {metadata[field]!r}, Cargo.toml has {wanted!r}"
assert metadata["Requires-Dist"] is None, "the program needs no Python package"
told = subprocess.run([venv / "bin/genewane", "--version"], capture_output=True, text=True, check=True)
assert told.stdout == f"genewane {cargo['version']}\n", told.stdout
print(f"{wheel.name}: the program, its licences, the metadata of Cargo.toml")
