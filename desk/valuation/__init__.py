"""Measures, and the standing of a book."""
