"""Words and forms that have their place in the language and arrive in a later version.

They are refused by name, so that nobody looks for a spelling mistake.
"""

import re

from rules.conditions.errors import ConditionError

_FORMS = tuple(
    (re.compile(pattern), words)
    for pattern, words in (
        (r"\bstarts\s+of\b", "starts of … in …"),
        (r"\brun\s+time\s+of\b", "run time of … in …"),
        (r"\btime\s+between\b", "time between … and …"),
        (r"\btime\s+[\w-]+\s+of\b", "time … of … in …"),
        (r"\bday\s+is\b", "day is …"),
        (r"\bmonth\s+is\b", "month is …"),
        (r"\b(?:any|all|none)\s+of\b", "any of …, all of …, none of …"),
        (r"\bis\s+faulty\b", "is faulty"),
        (r"\bis\s+locked\s+out\b", "is locked out"),
    )
)


def refuse_later_forms(text: str) -> None:
    """Raise ConditionError where `text` has a form that is not yet supported."""
    for pattern, words in _FORMS:
        if found := pattern.search(text):
            raise ConditionError(f"`{words}` is not yet supported", found.start() + 1, found=found.group())
