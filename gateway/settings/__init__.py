"""Settings: the files that a user writes, read strictly, with a place for every complaint.

text → `yaml_reader` → `models` (and their `fields`) → `cross` checks over `names` → `assemble` → plans for the plant.
"""
