"""Periodic structures that are not ink, one file a kind."""
