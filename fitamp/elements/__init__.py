"""Element values from sweeps: which one moved, by how much, and what follows."""
