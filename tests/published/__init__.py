"""Checks against published figures, each with its source beside it."""
