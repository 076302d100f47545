"""What everybody may import and what imports nobody."""
