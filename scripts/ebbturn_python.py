# SPDX-License-Identifier: BSD-2-Clause
"""For scripts that need numpy, h5py and matplotlib: where the python that runs lacks one, Debian's own is tried once."""
import os
import sys

DEBIAN = "/usr/bin/python3"
TRIED = "EBBTURN_PYTHON_TRIED"


def switch(script, missing):
    """Starts the script again under Debian's python; ends with a message where that has been tried or is not there."""
    if TRIED not in os.environ and os.access(DEBIAN, os.X_OK):
        os.environ[TRIED] = "1"
        os.execv(DEBIAN, [DEBIAN, *sys.argv])
    sys.exit(f"{script}: error: '{sys.executable}' lacks the module '{missing.name}'\n"
             "  try   apt-get install python3-numpy python3-h5py python3-matplotlib, or a python that has them")
