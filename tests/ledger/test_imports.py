import subprocess
import sys
from pathlib import Path

import sameline.ledger

MODULES = sorted(f"sameline.ledger.{path.stem}" for path in Path(sameline.ledger.__file__).parent.glob("[a-z]*.py"))


def test_the_ledger_loads_the_standard_library_and_the_errors_only():
    assert len(MODULES) > 8
    code = f"""
import sys
before = set(sys.modules)
import {", ".join(MODULES)}
loaded = {{name.partition(".")[0] for name in set(sys.modules) - before}}
print(sorted(loaded - sys.stdlib_module_names))
print(sorted(name for name in sys.modules if name.startswith("sameline.") and "ledger" not in name))
"""
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.splitlines() == ["['sameline']", "['sameline.errors', 'sameline.version']"]
