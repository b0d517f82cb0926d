"""What a cell does with the rates: densities, fields, decay, and which of them wins."""
