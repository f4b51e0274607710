"""Reports: a :class:`levelcrossing.model.Review` becomes text. Nothing here prints."""
