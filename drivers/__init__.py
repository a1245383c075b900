"""Descriptions of instruments, as data."""
