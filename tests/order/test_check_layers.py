# SPDX-License-Identifier: BSD-2-Clause
"""The layer check refuses what it should: a check that cannot fail tests nothing."""
import pathlib
import subprocess
import sys
import tempfile
import unittest

SCRIPT = pathlib.Path(__file__).resolve().parents[2] / "scripts" / "check-layers.py"
HEADER = "/* SPDX-License-Identifier: BSD-2-Clause\n *\n * Layer {}. Text. */\n#ifndef X\n#endif\n"


class CheckLayers(unittest.TestCase):
    def run_on(self, files):
        with tempfile.TemporaryDirectory() as folder:
            for name, text in files.items():
                path = pathlib.Path(folder, name)
                path.parent.mkdir(parents=True, exist_ok=True)
                path.write_text(text)
            return subprocess.run([sys.executable, SCRIPT, folder], capture_output=True, text=True)

    def expect(self, files, text):
        run = self.run_on(files)
        self.assertEqual(run.returncode, 1 if text else 0, run.stdout + run.stderr)
        self.assertIn(text or "points down", run.stdout)

    def test_down_is_allowed(self):
        self.expect({"include/ebbturn/a.h": HEADER.format("L0 (base)"), "src/model/m.c": '#include "ebbturn/a.h"\n'}, None)

    def test_up_is_refused(self):
        self.expect({"include/ebbturn/s.h": HEADER.format("L3 (solve)"), "src/model/m.c": 'x\n#include "ebbturn/s.h"\n'},
                    "src/model/m.c:2: model (L2) includes ebbturn/s.h of solve (L3)")

    def test_measure_and_io_do_not_know_each_other(self):
        header = {"include/ebbturn/s.h": HEADER.format("L4 (io)")}
        self.expect(header | {"src/measure/readings/r.c": '#include "ebbturn/s.h"\n'}, "of io (L4)")

    def test_private_header_belongs_to_its_folder(self):
        self.expect({"src/solve/p.h": "", "src/base/b.c": '#include "solve/p.h"\n'}, "of solve (L3)")
        self.expect({"src/solve/p.h": "", "src/base/b.c": '#include "../solve/p.h"\n'}, "of solve (L3)")

    def test_rows_know_no_petsc(self):
        self.expect({"src/operators/o.c": "#include <petscvec.h>\n"}, "src/operators/o.c:1")
        self.expect({"src/measure/o.c": "#include <hdf5.h>\n"}, "which only io may know")

    def test_header_must_name_its_layer(self):
        self.expect({"include/ebbturn/a.h": HEADER.format("L2 (base)")}, "names no layer")
        self.expect({"include/ebbturn/a.h": "#ifndef X\n#endif\n"}, "names no layer")


if __name__ == "__main__":
    unittest.main()
