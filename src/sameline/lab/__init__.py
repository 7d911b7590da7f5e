"""The Python face of a laboratory: acts that record, and reads of what is recorded.

Every act is one transaction with one ledger entry. In the same transaction it marks the comparisons that it touches;
after it commits, each of them is answered anew in a transaction of its own. If that is cut short, they stay visibly
behind, and the next act or `Lab.catch_up` answers them.

    import sameline

    with sameline.open_lab("lab.db") as lab:
        frame = lab.measurements()
        answer = lab.conclusion("seal set")
"""

from __future__ import annotations

from sameline.lab.laboratory import Lab, make_lab, open_lab
from sameline.lab.outcomes import WAKES, Outcome, Taken

__all__ = ["WAKES", "Lab", "Outcome", "Taken", "make_lab", "open_lab"]
