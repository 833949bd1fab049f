"""The commands of the terminal, one file each; `cli.py` loads the one that is asked for."""
