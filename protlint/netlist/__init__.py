"""Reading: a file becomes positioned forms, definitions, and one flat netlist."""
