"""``python -m carboy``: the same as the command ``carboy``."""

from carboy.cli.start import run

if __name__ == "__main__":
    run()
