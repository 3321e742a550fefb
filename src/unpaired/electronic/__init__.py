"""Self-consistent fields through PySCF: the only package beside the catalogue that imports it."""
