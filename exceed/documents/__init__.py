"""What the user writes: YAML files, read with line and column."""
