"""What a reviewer asks about a model before any results: can it stand, is it connected, do its numbers make sense?

Each theme is a module of checks; a check is a function from a Subject to findings, and its docstring says what it asks,
why, and what to look at. CHECKS in inspect.py is the only list of them.
"""
