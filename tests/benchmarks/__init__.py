"""Measurements that print one table each; run by hand, not by the test command."""
