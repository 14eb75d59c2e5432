"""A second judge of the sample lots, written apart from the program and from the generator."""
