"""The stages in order: each command of the program as a call on values."""
