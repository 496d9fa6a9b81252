"""``python -m aggregator``: the same as the command ``fieldfold``."""

from aggregator.cli import main

main()
