"""Write the files in `expected/` anew: run this when a text was changed on purpose, and read the difference."""

import runpy
import tempfile
from pathlib import Path

here = Path(__file__).parent
conftest = runpy.run_path(str(here / "conftest.py"))
with tempfile.TemporaryDirectory() as folder:
    for name, text in conftest["texts"](Path(folder)).items():
        (here / "expected" / f"{name}.txt").write_text(text, encoding="utf-8")
