"""Spreadsheets into a book and a list of faults."""
