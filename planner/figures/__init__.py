"""Figures for the report and the workbook, without Qt."""
