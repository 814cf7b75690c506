"""The demonstration workbooks of one invented tile works: one module a workbook, and what they share."""
