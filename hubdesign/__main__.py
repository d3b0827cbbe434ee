"""``python -m hubdesign``."""

from hubdesign.cli import main

main(prog_name="hubdesign")
