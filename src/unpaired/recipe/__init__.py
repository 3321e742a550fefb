"""Recipes - YAML with line numbers, read strictly, understood as a whole."""
