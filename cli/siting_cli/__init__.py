"""The command line of siting."""
