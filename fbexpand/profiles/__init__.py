"""Profiles: callables and tables, resolved into polynomial panels."""
