"""crosscheck: a second and third opinion on plane-frame results, and where and why they differ.

Importing the package imports none of the numerical libraries; each room is imported when it is needed.
"""

__version__ = "0.1.0"
