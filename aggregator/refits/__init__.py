"""Many fits, on this machine's processes or on a cluster."""
