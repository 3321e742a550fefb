"""Where molecules come from, and which of their nuclei are equivalent."""
