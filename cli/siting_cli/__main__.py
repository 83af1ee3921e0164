"""Run the command line with `python -m siting_cli`."""

from siting_cli.main import main

main()
