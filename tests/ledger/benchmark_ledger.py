"""How fast rows are hashed into the ledger, as ratios to peers measured in the same run.

Run: python tests/ledger/benchmark_ledger.py [rows]

The row has 8 fields, as a replicate has them: four whole numbers, a float, three short texts. The peers
are a plain sorted JSON dump (which is not RFC 8785) and the rfc8785 package, each with the same hashing.
"""

import json
import sys
import time
from collections.abc import Callable

import numpy as np
import rfc8785

from sameline.ledger.merkle import Frontier, leaf_hash, leaf_hashes, root
from sameline.ledger.rows import RowEncoder, row_bytes

COLUMNS = ["id", "entry", "run", "number", "value", "recorded", "qualifier", "unit"]
Row = tuple[int, int, int, int, float, str, str, str]


def made_rows(count: int) -> list[Row]:
    values = np.random.default_rng(1).normal(12, 1, count).round(2).tolist()
    return [(i, i // 50, 1000 + i // 5, i % 5, x, f"{x:.2f}", "=", "MPa") for i, x in enumerate(values)]


def seconds(work: Callable[[], object], times: int = 15) -> float:
    """Processor time, the best of several: what the machine can do when nothing else disturbs it."""
    best = float("inf")
    for _ in range(times):
        start = time.process_time()
        work()
        best = min(best, time.process_time() - start)
    return best


def by_frontier(data: list[bytes]) -> bytes:
    frontier = Frontier()
    for row in data:
        frontier.add(leaf_hash(row))
    return frontier.root()


def main(count: int) -> None:
    rows = made_rows(count)
    encode = RowEncoder("replicate", COLUMNS)
    documents = [{"fields": dict(zip(COLUMNS, row, strict=True)), "table": "replicate"} for row in rows]
    data = encode.many(rows)
    hashes = leaf_hashes(data)
    ways = {
        "encode: RowEncoder.many": lambda: encode.many(rows),
        "encode: RowEncoder, one by one": lambda: [encode(row) for row in rows],
        "encode: row_bytes, the definition": lambda: [row_bytes("replicate", d["fields"]) for d in documents],
        "encode: json.dumps, sorted (peer)": lambda: [
            json.dumps(d, sort_keys=True, separators=(",", ":")).encode() for d in documents
        ],
        "encode: rfc8785 (peer)": lambda: [rfc8785.dumps(d) for d in documents],
        "hash: leaf_hashes": lambda: leaf_hashes(data),
        "tree: root": lambda: root(hashes),
        "all: many, leaf_hashes, root": lambda: root(leaf_hashes(encode.many(rows))),
        "all: many, leaf_hash, Frontier": lambda: by_frontier(encode.many(rows)),
    }
    taken = {name: seconds(work) for name, work in ways.items()}
    peer = taken["encode: rfc8785 (peer)"]
    print(f"{count} rows of {len(COLUMNS)} fields, {len(data[-1])} bytes each; ratio to rfc8785 encoding alone")
    for name, value in taken.items():
        print(f"{name:36} {count / value:12,.0f} rows/s {peer / value:8.2f}")


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 10_000)
