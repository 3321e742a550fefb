"""The only package that imports PySCF beside the catalogue."""
