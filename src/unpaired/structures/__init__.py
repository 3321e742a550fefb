"""Structures: reading, writing, building and judging them, and which of their nuclei are equivalent."""
