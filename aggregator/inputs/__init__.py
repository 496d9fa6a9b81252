"""The desk's files, read and checked whole."""
