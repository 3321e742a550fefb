"""Recipes: YAML with line numbers, read strictly, understood as a whole."""

from __future__ import annotations

from .load import load_recipe, load_recipes
from .recipe import Measured, MeasuredG, Motion, Recipe

__all__ = ["Measured", "MeasuredG", "Motion", "Recipe", "load_recipe", "load_recipes"]
