# SPDX-License-Identifier: BSD-2-Clause
"""The worked models that take seconds."""
from common import check, finish, os
from worked_inputs import SLOW, all_of, files

check(set(SLOW) <= {os.path.basename(path) for path in files()}, "every slow model is there")
all_of(lambda name: name in SLOW)
finish()
