"""Fixtures that every part of the suite shares.

Tests that ask for a database run on SQLite and on PostgreSQL; ``--database sqlite`` runs one.
"""

pytest_plugins = ["tests.databases", "tests.clients"]
