"""Plots, drawn with matplotlib, readable in grey."""
