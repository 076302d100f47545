"""Findings become words, tables and pages; nothing here computes."""
