"""The board: the netlist with kinds, values, supplies and merged banks and chains, as a graph and an index."""
