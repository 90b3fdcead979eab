"""The third opinion: the program library anastruct, asked only what it gets right and held to closed forms first."""

from crosscheck.opinions.library.opinion import NAME, SIZE_LIMIT, opine

__all__ = ["NAME", "SIZE_LIMIT", "opine"]
