"""``python -m fem.cli``."""

from fem.cli.app import main

main()
