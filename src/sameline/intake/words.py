"""Words that stand over columns, and what they say the column is (common usage, no source)."""

from __future__ import annotations

from sameline.intake.headings import fold
from sameline.records.drafts import Register

WORDS = {
    "batch": "batch lot charge lot_no batch_no lot_number batch_number batch_id lot_id sample sample_id los",
    "characteristic": "characteristic property test parameter test_name method merkmal prüfung",
    "tested_at": "tested_at date test_date tested tested_on timestamp date_time datetime datum when",
    "time": "time test_time clock uhrzeit zeit time_of_day",
    "analyst": "analyst operator technician tester tested_by person inspector prüfer by user",
    "instrument": "instrument machine rig device equipment apparatus gerät prüfgerät tester_id machine_id gauge",
    "session": "session series shift occasion sequence schicht serie",
    "replicate": "replicate rep specimen specimen_no no nr # repeat probe reading_no test_piece piece number",
    "value": "value result reading measurement measured wert messwert ergebnis measured_value figure",
    "unit": "unit units uom einheit",
    "note": "note notes remark remarks comment comments bemerkung kommentar",
}
"""Field -> headings that are used for it, folded."""


def field_of(heading: str) -> str | None:
    """The field that a heading is used for, when it is a word in use."""
    folded = fold(heading).strip(".:")
    return next((field for field, words in WORDS.items() if folded in words.split()), None)


def heading_words(register: Register) -> frozenset[str]:
    """Everything that may stand over a column: the words above and the codes of characteristics."""
    words = {word for spelled in WORDS.values() for word in spelled.split()}
    return frozenset(words | {fold(code) for code in register.characteristics})
