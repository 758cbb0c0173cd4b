"""Let the modules beside this file find one another, as they do when run as programs."""

from __future__ import annotations

import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent))
