"""The version of this package, also without an installation."""

VERSION = "0.1.0"
