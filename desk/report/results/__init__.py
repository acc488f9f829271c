"""The report: results as a workbook in which a reviewer can recompute each figure."""
