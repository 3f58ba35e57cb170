# SPDX-License-Identifier: BSD-2-Clause
"""Every worked model that takes a second or less; the others in test_inputs_slow.py."""
from common import check, finish
from worked_inputs import SLOW, all_of, files

check(len(files()) >= 5, f"{len(files())} worked files")
all_of(lambda name: name not in SLOW)
finish()
