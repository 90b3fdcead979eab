"""Published values, each with its source and status (see test_published.py)."""
