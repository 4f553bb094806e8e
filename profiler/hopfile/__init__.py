"""Hop files."""
