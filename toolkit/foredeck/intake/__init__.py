"""From files to one tidy history."""
