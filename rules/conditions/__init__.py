"""The language of conditions: text → tree → checked tree → compiled closures."""
