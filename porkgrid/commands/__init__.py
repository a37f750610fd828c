"""The commands: each parses its arguments, calls the engine and prints."""
