"""The command line: options in, one library call, text and exit code out. Imported by nobody."""

from hubdesign.cli.main import main

__all__ = ["main"]
