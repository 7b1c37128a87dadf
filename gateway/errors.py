"""The errors that a user can meet: whose fault it is, and what to do now.

    BrimwardError        anything that ends a command with a sentence and exit status 2
    ├── SettingsError    the settings' author: every complaint with its place
    ├── InputError       the person at the command line, or the author of a trace
    ├── BrokerError      the broker, or the way to it
    └── JournalError     the journal's file or disk

A traceback is always a bug of ours, and never any of these.
"""


class BrimwardError(Exception):
    """A sentence for people. Commands print it and end with exit status 2."""


class InputError(BrimwardError):
    """What was given on the command line, or in a trace, cannot be used as it is."""


class BrokerError(BrimwardError):
    """The broker cannot be reached or refuses; the message names the broker and the reason."""


class JournalError(BrimwardError):
    """The journal cannot be opened, read or written; the message names the file and the reason."""
