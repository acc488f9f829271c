"""Results into workbooks, CSV and JSON."""
