"""Hosts move cells in and out; they hold no statistics."""
