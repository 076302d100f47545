"""Tests of the report: what is worded, and that nothing is lost or broken out of."""
