"""What a round publishes for readers."""
