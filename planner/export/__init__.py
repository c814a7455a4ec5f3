"""Workbook, lists and reports."""
