import json
from dataclasses import replace
from datetime import UTC, datetime, timedelta

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sameline.ledger.checkpoint import sign_checkpoint
from sameline.ledger.errors import FormatError
from sameline.ledger.manifest import TableRows, manifest_text
from sameline.ledger.merkle import leaf_hash, root
from sameline.ledger.proof_checks import Check, check_extension_proof, check_row_proof
from sameline.ledger.proof_files import ExtensionProof, RowProof, parse_proof
from sameline.ledger.proofs import consistency_path, inclusion_path, node_reader
from sameline.ledger.rows import row_bytes
from sameline.ledger.signatures import SigningKey

ENTRIES = 21
MOMENT = datetime(2026, 3, 2, 14, 5, 9, tzinfo=UTC)


def rows_of(number: int):
    """The rows that one entry of the small ledger wrote: runs, and replicates with values of every kind."""
    runs = [row_bytes("run", {"id": 2 * number + i, "entry": number, "analyst": "M. Okafor"}) for i in range(2)]
    values = [12.5, 5.0, 1e-7, -3.25, 1e21]
    replicates = [
        row_bytes("replicate", {"id": 5 * number + i, "entry": number, "recorded": str(x), "value": x})
        for i, x in enumerate(values)
    ]
    return {"run": runs, "replicate": replicates}


def entry_of(number: int):
    first = {"run": 2 * number, "replicate": 5 * number}
    parts = [
        TableRows(table, first[table], len(rows), root([leaf_hash(row) for row in rows]))
        for table, rows in rows_of(number).items()
    ]
    fields = {"number": number, "at": "2026-03-02T14:05:09.000000Z", "act": "log", "rows": manifest_text(parts)}
    return row_bytes("entry", fields)


LEAVES = [leaf_hash(entry_of(number)) for number in range(1, ENTRIES + 1)]


def checkpoint_of(key: SigningKey, entries: int):
    time = MOMENT + timedelta(hours=entries)
    laboratory = "Northbank Materials Laboratory"
    top = root(LEAVES[:entries])
    return sign_checkpoint(key, laboratory=laboratory, entries=entries, root=top, time=time, signer="M. Okafor")


def row_proof(key: SigningKey, number: int, table: str, place: int):
    rows = rows_of(number)[table]
    return RowProof(
        entry=entry_of(number),
        entry_path=tuple(inclusion_path(number - 1, ENTRIES, node_reader(LEAVES))),
        checkpoint=checkpoint_of(key, ENTRIES),
        row=rows[place],
        row_path=tuple(inclusion_path(place, len(rows), node_reader([leaf_hash(row) for row in rows]))),
    )


def extension_proof(key: SigningKey, old: int, new: int):
    path = tuple(consistency_path(old, new, node_reader(LEAVES[:new])))
    return ExtensionProof(checkpoint_of(key, old), checkpoint_of(key, new), path)


def failed(checks: list[Check]):
    return [check.number for check in checks if not check.holds]


@pytest.mark.parametrize("number", [1, 8, 20, ENTRIES])
def test_every_row_of_an_entry_is_proven_and_comes_back_from_its_file(signing_key: SigningKey, number: int):
    for table, rows in rows_of(number).items():
        for place in range(len(rows)):
            proof = row_proof(signing_key, number, table, place)
            assert parse_proof(proof.to_bytes()) == proof
            checks = check_row_proof(proof, [signing_key.public])
            assert [check.number for check in checks] == [1, 2, 3, 4, 5, 6]
            assert failed(checks) == []


def test_an_entry_alone_is_proven(signing_key: SigningKey):
    proof = replace(row_proof(signing_key, 5, "run", 0), row=None, row_path=())
    assert parse_proof(proof.to_bytes()) == proof
    checks = check_row_proof(proof)
    assert len(checks) == 3
    assert failed(checks) == []


def test_a_later_ledger_is_proven_to_begin_with_an_earlier_one(signing_key: SigningKey):
    for old, new in [(1, 21), (8, 21), (13, 20), (21, 21)]:
        proof = extension_proof(signing_key, old, new)
        assert parse_proof(proof.to_bytes()) == proof
        checks = check_extension_proof(proof, [signing_key.public])
        assert len(checks) == 5
        assert failed(checks) == []


# One change each, and the numbers of the checks that must find it.
ROW_CHANGES = {
    "another value in the row": (lambda p: {"row": p.row.replace(b"12.5", b"12.6")}, [4]),
    "another spelling of the row": (lambda p: {"row": p.row.replace(b":12.5", b":12.50")}, [2, 3, 4]),
    "another id": (lambda p: {"row": p.row.replace(b'"id":45', b'"id":46')}, [4]),
    "an id before the entry's first": (lambda p: {"row": p.row.replace(b'"id":45', b'"id":44')}, [4]),
    "no id": (lambda p: {"row": p.row.replace(b'"id":45,', b"")}, [4]),
    "an id that is no number": (lambda p: {"row": p.row.replace(b'"id":45', b'"id":"45"')}, [4]),
    "another table": (lambda p: {"row": p.row.replace(b'"replicate"', b'"run"')}, [4]),
    "a table without rows": (lambda p: {"row": p.row.replace(b'"replicate"', b'"batch"')}, [4]),
    "another entry's row": (lambda _p: {"row": rows_of(8)["replicate"][0]}, [3, 4]),
    "a row that names another entry": (lambda p: {"row": p.row.replace(b'"entry":9', b'"entry":8')}, [3, 4]),
    "a row that names no entry": (lambda p: {"row": p.row.replace(b'"entry":9,', b"")}, [3, 4]),
    "a row that is a list": (lambda _p: {"row": b"[]"}, [2, 3, 4]),
    "a row with a list in it": (lambda _p: {"row": b'{"fields":{"id":[]},"table":"run"}'}, [2, 3, 4]),
    "a shorter row path": (lambda p: {"row_path": p.row_path[:-1]}, [4]),
    "a row path in another order": (lambda p: {"row_path": p.row_path[::-1]}, [4]),
    "another entry": (lambda _p: {"entry": entry_of(8)}, [3, 4, 5]),
    "another act in the entry": (lambda p: {"entry": p.entry.replace(b'"log"', b'"lot"')}, [5]),
    "another root in the entry": (
        lambda p: {"entry": p.entry.replace(b'root\\":\\"', b'root\\":\\"0', 1)},
        [1, 3, 4, 5],
    ),
    "an entry without number": (lambda p: {"entry": p.entry.replace(b'"number":9,', b"")}, [1, 3, 4, 5]),
    "entry nought": (lambda p: {"entry": p.entry.replace(b'"number":9', b'"number":0')}, [1, 3, 4, 5]),
    "an entry that is another row": (lambda p: {"entry": p.entry.replace(b'"entry"', b'"run"')}, [1, 3, 4, 5]),
    "an entry beyond the checkpoint": (lambda p: {"entry": p.entry.replace(b'"number":9', b'"number":99')}, [3, 5]),
    "a longer entry path": (lambda p: {"entry_path": (*p.entry_path, bytes(32))}, [5]),
    "a checkpoint of another size": (lambda p: {"checkpoint": replace(p.checkpoint, entries=64)}, [5, 6]),
    "a checkpoint of another size in which the leaf's path looks alike": (
        lambda p: {"checkpoint": replace(p.checkpoint, entries=22)},
        [6],
    ),
    "a checkpoint of another root": (lambda p: {"checkpoint": replace(p.checkpoint, root=bytes(32))}, [5, 6]),
    "a checkpoint signed by nobody": (lambda p: {"checkpoint": replace(p.checkpoint, signature=bytes(64))}, [6]),
    "everything": (
        lambda p: {"row": b"1", "entry": b"2", "checkpoint": replace(p.checkpoint, signer="X")},
        [*range(1, 7)],
    ),
}


@pytest.mark.parametrize("name", ROW_CHANGES)
def test_each_change_is_found_and_all_that_follows_from_it_is_reported(signing_key: SigningKey, name: str):
    change, want = ROW_CHANGES[name]
    proof = row_proof(signing_key, 9, "replicate", 0)
    changed = replace(proof, **change(proof))
    assert changed != proof
    assert failed(check_row_proof(changed)) == want


def test_a_checkpoint_by_another_key_is_found(signing_key: SigningKey, other_key: SigningKey):
    proof = row_proof(other_key, 9, "run", 1)
    assert failed(check_row_proof(proof)) == []
    assert failed(check_row_proof(proof, [signing_key.public])) == [6]
    extension = extension_proof(other_key, 3, 9)
    assert failed(check_extension_proof(extension, [signing_key.public])) == [4, 5]


def test_a_ledger_that_was_cut_or_rewritten_does_not_extend_the_earlier_one(signing_key: SigningKey):
    proof = extension_proof(signing_key, 13, 20)
    rewritten = [*LEAVES[:4], leaf_hash(b"another entry"), *LEAVES[5:20]]
    later = sign_checkpoint(
        signing_key,
        laboratory=proof.later.laboratory,
        entries=20,
        root=root(rewritten),
        time=proof.later.time,
        signer="M. Okafor",
    )
    path = tuple(consistency_path(13, 20, node_reader(rewritten)))
    assert failed(check_extension_proof(ExtensionProof(proof.earlier, later, path))) == [3]
    assert failed(check_extension_proof(replace(proof, earlier=proof.later, later=proof.earlier))) == [2, 3]
    assert failed(check_extension_proof(replace(proof, path=proof.path[1:]))) == [3]
    foreign = sign_checkpoint(
        signing_key, laboratory="Southbank", entries=20, root=root(LEAVES[:20]), time=later.time, signer="M. Okafor"
    )
    assert failed(check_extension_proof(replace(proof, later=foreign))) == [1]


def test_a_finding_says_what_was_got_and_wanted(signing_key: SigningKey):
    proof = row_proof(signing_key, 9, "replicate", 0)
    check = check_row_proof(replace(proof, row=proof.row.replace(b'"entry":9', b'"entry":8')))[2]
    assert check.what == "the row names this entry as its own"
    assert check.finding == "the row is of another entry: got 8, want 9"


def documents(signing_key: SigningKey):
    return [row_proof(signing_key, 9, "replicate", 0).to_bytes(), extension_proof(signing_key, 13, 20).to_bytes()]


@pytest.mark.parametrize("kind", [0, 1])
def test_every_member_is_needed_and_no_other_is_taken(signing_key: SigningKey, kind: int):
    document = json.loads(documents(signing_key)[kind])

    def refused(changed: object) -> None:
        with pytest.raises(FormatError):
            parse_proof(json.dumps(changed).encode())

    for name in document:
        if name != "row":
            refused({other: value for other, value in document.items() if other != name})
        for value in (None, 1, "x", [], {}, ["x"], [1], "\ud800", {"text": "x"}, {"text": 1, "path": []}):
            if (name, value) != ("path", []):
                refused({**document, name: value})
    refused({**document, "note": "x"})
    refused([document])


@pytest.mark.parametrize(
    "data", [b"", b"{", b"[]", b"null", b"\xff", b'{"form":NaN}', b'{"form":1,"form":1}', b"[" * 10**5]
)
def test_what_is_no_proof_is_refused(data: bytes):
    with pytest.raises(FormatError):
        parse_proof(data)


def test_a_refusal_says_where(signing_key: SigningKey):
    text = documents(signing_key)[0].decode()
    with pytest.raises(FormatError) as caught:
        parse_proof(text.replace("entries: 21", "entries: x").encode())
    assert caught.value.where == "checkpoint, line 3"


@settings(max_examples=400)
@given(data=st.data(), kind=st.integers(0, 1))
def test_a_changed_document_is_refused_or_does_not_hold_or_says_the_same(
    data: st.DataObject, kind: int, signing_key: SigningKey
):
    original = documents(signing_key)[kind]
    content = bytearray(original)
    for _ in range(data.draw(st.integers(1, 3))):
        start = data.draw(st.integers(0, len(content)))
        content[start : start + data.draw(st.integers(0, 5))] = data.draw(
            st.binary(max_size=5) | st.sampled_from([b'"', b",", b"[]", b"null", b"1e999", b"\\ud800", b"0", b"{}"])
        )
    try:
        proof = parse_proof(bytes(content))
    except FormatError:
        return
    check = check_row_proof if isinstance(proof, RowProof) else check_extension_proof
    if failed(check(proof, [signing_key.public])) == []:
        assert proof == parse_proof(original)
