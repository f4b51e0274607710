"""Readers: a file on disk becomes a :class:`levelcrossing.model.Board`."""
