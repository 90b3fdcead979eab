"""Tests, and what they share: an independent solver (truth.py), random frames (random_frames.py), published values."""
