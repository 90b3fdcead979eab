"""Pasted results to a Reading; knows the frame's names and no opinion."""

from crosscheck.claims.read import read_claim, read_claim_text
from crosscheck.claims.reading import Entry, FrameNames, Reading, ReadingOptions
from crosscheck.claims.show import show_reading

__all__ = ["Entry", "FrameNames", "Reading", "ReadingOptions", "read_claim", "read_claim_text", "show_reading"]
