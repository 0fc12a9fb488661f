"""The version, as plain data: reading it loads nothing else."""

__version__ = "0.1.0"
