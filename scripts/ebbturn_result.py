# SPDX-License-Identifier: BSD-2-Clause
"""Reads an ebbturn result: r = Result("x.h5"); r["moments/v_mean"], r.error("moments/v_mean"), r.text("/", "title")."""
import json
import h5py
import numpy as np


class Result:
    def __init__(self, path):
        self.file = h5py.File(path, "r")
        if self.text("/", "program") != "ebbturn":
            raise OSError(f"'{path}' is not an ebbturn result")
        self.settings = json.loads(self.text("/", "settings_json") or "{}")
        self.complete = bool(self.file.attrs.get("complete", 0))

    def __contains__(self, path):
        return path in self.file

    def __getitem__(self, path):  # an array, complex128 for /state/psi; a float for a scalar; NaN where missing
        return self.file[path][()] if path in self.file else np.nan

    def error(self, path):  # absolute error estimate beside it
        return self[path + "_error"]

    def text(self, path, name):  # a text attribute, "" where missing
        value = self.file[path].attrs.get(name, b"") if path in self.file else b""
        return value.decode(errors="replace") if isinstance(value, bytes) else str(value)
