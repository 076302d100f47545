"""Pure functions of numpy arrays in SI: the physics behind every derived quantity, each with its source."""
