#!/usr/bin/env python3
# SPDX-License-Identifier: BSD-2-Clause
"""Checks that #include points down only. A public header's layer is the one its first comment names ("Layer L2 (model)"),
that of any other file is its folder under src. Usage: check-layers.py [ROOT]; prints every violation, exit 1 if there is one."""
import pathlib
import re
import sys

LEVEL = {"base": 0, "operators": 1, "matter": 1, "model": 2, "solve": 3, "measure": 4, "io": 4, "app": 5}
# Libraries that only these layers may know; a row of an operator is a plain function of doubles.
FOREIGN = {r"petsc|slepc|mpi\.h": {"model", "solve", "measure", "io", "app"}, r"hdf5|yaml": {"io"}}
SIDEWAYS = {("operators", "matter"), ("matter", "operators")}  # both are L1 catalogues; measure and io do not know each other

root = pathlib.Path(sys.argv[1] if len(sys.argv) > 1 else pathlib.Path(__file__).parent.parent).resolve()
problems, layer = [], {}
for header in sorted((root / "include").rglob("*.h")):
    comment = re.search(r"/\*.*?\*/.*?(?=\n#|\Z)", header.read_text(), re.S)
    named = re.search(r"Layer L(\d) \((\w+)\)", comment.group() if comment else "")
    if not named or LEVEL.get(named[2]) != int(named[1]):
        problems.append(f"{header.relative_to(root)}:1: the first comment names no layer such as 'Layer L2 (model)'")
    layer[header] = named[2] if named else None
for file in sorted((root / "src").rglob("*.[ch]")):
    layer[file] = file.relative_to(root / "src").parts[0]

for file, own in layer.items():
    for number, line in enumerate(file.read_text().splitlines(), 1):
        include = re.match(r'\s*#\s*include\s*[<"]([^>"]+)', line)
        if not include or own not in LEVEL:
            continue
        where = f"{file.relative_to(root)}:{number}: {own} (L{LEVEL[own]}) includes {include[1]}"
        candidates = (file.parent / include[1], root / "include" / include[1], root / "src" / include[1])
        other = next((layer[p.resolve()] for p in candidates if p.resolve() in layer), None)
        if other in LEVEL and other != own and (own, other) not in SIDEWAYS and LEVEL[other] >= LEVEL[own]:
            problems.append(f"{where} of {other} (L{LEVEL[other]})")
        problems += [f"{where}, which only {', '.join(sorted(k))} may know"
                     for name, k in FOREIGN.items() if re.match(name, include[1]) and own not in k]
print("\n".join(problems) if problems else f"{len(layer)} files, every #include points down")
sys.exit(bool(problems))
