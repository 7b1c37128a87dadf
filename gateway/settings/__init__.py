"""Settings: the files that a user writes, read strictly, with a place for every complaint."""
