"""``python -m tautbar`` is the command ``tautbar``."""

from __future__ import annotations

import sys

from tautbar.cli import main

sys.exit(main())
