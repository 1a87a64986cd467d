"""Frozen dataclasses that every layer shares. Nothing here computes astronomy or touches a file."""
