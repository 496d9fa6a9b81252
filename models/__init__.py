"""The statistics: labelled arrays in, a ``pm.Model`` out; no files, no commands."""
