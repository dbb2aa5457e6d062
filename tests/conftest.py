"""What holds for all tests."""

from __future__ import annotations

import os

# as the command line has it, and because several tests run beside one another
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
