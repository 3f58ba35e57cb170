# SPDX-License-Identifier: BSD-2-Clause
"""Configuration stops when the files of a catalogue folder and its catalogue.def differ."""
import pathlib
import subprocess
import tempfile
import unittest

MODULE = pathlib.Path(__file__).resolve().parents[2] / "scripts" / "cmake" / "EbbLayers.cmake"


class CheckCatalogue(unittest.TestCase):
    def configure(self, files):
        with tempfile.TemporaryDirectory() as folder:
            top = pathlib.Path(folder)
            (top / "kinds").mkdir()
            (top / "CMakeLists.txt").write_text(
                "cmake_minimum_required(VERSION 3.25)\nproject(check LANGUAGES NONE)\n"
                f'include("{MODULE}")\nebb_check_catalogue("${{PROJECT_SOURCE_DIR}}/kinds")\n')
            for name, text in files.items():
                (top / "kinds" / name).write_text(text)
            run = subprocess.run(["cmake", "-S", top, "-B", top / "build"], capture_output=True, text=True)
            return run.returncode, " ".join(run.stderr.split())

    def test_agreement_and_empty_folder(self):
        self.assertEqual(self.configure({})[0], 0)
        listed = "/* kinds */\nEBB_KIND(one)\nEBB_KIND( two, \"x\")\n"
        self.assertEqual(self.configure({"catalogue.def": listed, "one.c": "", "two.c": "", "catalogue.c": "", "a.h": ""}),
                         (0, ""))

    def test_differences_are_refused(self):
        for files, text in (({"catalogue.def": "K(one)\n", "one.c": "", "more.c": ""}, "more.c' is not in catalogue.def"),
                            ({"catalogue.def": "K(one)\nK(gone)\n", "one.c": ""}, "lists 'gone.c'"),
                            ({"catalogue.def": "K(one)\nK(one)\n", "one.c": ""}, "lists 'one.c' twice"),
                            ({"one.c": ""}, "is missing")):
            code, message = self.configure(files)
            self.assertNotEqual(code, 0, files)
            self.assertIn(text, message)


if __name__ == "__main__":
    unittest.main()
