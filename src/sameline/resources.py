"""Where the files that travel with Sameline are: the schema's migrations and the demo scenario.

In an installed copy they lie inside the package; in a source tree, beside it.
"""

from __future__ import annotations

from pathlib import Path

_PACKAGE = Path(__file__).parent


def _folder(packaged: str, in_tree: str) -> Path:
    inside = _PACKAGE / packaged
    return inside if inside.is_dir() else _PACKAGE.parents[1] / in_tree


def migrations_folder() -> Path:
    """The folder of Alembic's environment and revisions."""
    return _folder("_migrations", "migrations")


def seed_folder() -> Path:
    """The folder of the demo scenario."""
    return _folder("_seed", "seed")
