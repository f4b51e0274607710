"""Review every signal of a board that crosses from one supply to another."""

__version__ = "0.1.0"
