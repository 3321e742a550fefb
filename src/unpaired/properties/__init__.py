"""Numbers from finished wavefunctions, with numpy alone."""
