"""The version, stated once: packaging reads it from here, files are stamped with it."""

__all__ = ["VERSION"]

VERSION = "0.1.0"
