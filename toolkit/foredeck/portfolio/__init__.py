"""What is learned from all series together, applied to each."""
