"""The desk's program: it knows files, people and commands."""
