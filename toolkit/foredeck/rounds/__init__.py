"""The three passes, the states of a round, publishing."""
