"""Pieces that several pages use."""
