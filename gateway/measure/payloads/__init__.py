"""From the bytes of a message to a number or a word, with the time that the device says it is of."""
