"""The language of conditions: text → tree (`parse`) → checked tree (`check`) → closures over the board (`compile`)."""
