"""How far a diagram departs from the ground."""
