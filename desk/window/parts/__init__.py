"""Shared widgets: tables, pictures, fields, the look."""
