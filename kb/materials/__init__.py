"""What is in the bottle: solvents and reagents, their names, and the classes of a set of conditions."""
