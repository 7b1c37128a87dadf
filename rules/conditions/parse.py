"""From the text of a condition to its tree, or to a complaint that says where, what was found and what was expected.

Names and units are still text in the tree; `rules.conditions.check` gives them their meaning. The grammar is built
once, when this module is imported.
"""

from collections.abc import Callable
from typing import NoReturn

from lark import Lark, Token, Tree
from lark.exceptions import UnexpectedCharacters, UnexpectedInput, UnexpectedToken

from rules.conditions.errors import ConditionError
from rules.conditions.later import refuse_later_forms
from rules.conditions.tree import (
    And,
    AtLeast,
    Between,
    Commanded,
    Comparison,
    Condition,
    Held,
    Is,
    Literal,
    Name,
    Not,
    Or,
    Product,
    Relation,
    Status,
    Sum,
    Term,
)

Node = Tree[Token]

_PARSER = Lark.open("grammar.lark", rel_to=__file__, parser="lalr", lexer="contextual", propagate_positions=True)

LONGEST = 2_000  # characters; a longer sentence is a mistake, and would only feed the parser's stack
DEEPEST = 50  # levels of nesting; what walks a tree calls itself once a level, and a reader is lost after five

# Words of the language; nothing in a site can be called by one of them.
RESERVED = frozenset(
    {
        "above", "all", "and", "any", "at", "below", "between", "brim", "commanded", "day", "failed",
        "faulty", "flow", "for", "in", "is", "least", "level", "locked", "month", "most", "none", "not", "of",
        "or", "out", "rise", "run", "silent", "starts", "suction", "time", "time_to_brim", "time_to_suction",
        "to", "today", "ullage", "unknown", "usable", "volume",
    }
)  # fmt: skip

# What the parser can expect, in words for people. Anything not listed is shown as it is written.
_EXPECTED = {
    "NAME": "a name",
    "NUMBER": "a value",
    "UNIT": "a unit",
    "STATUS": "usable, unknown, silent or failed",
    "VOTE": "a vote such as 2oo3",
    "LPAR": "'('",
    "RPAR": "')'",
    "COMMA": "','",
    "PLUS": "'+'",
    "MINUS": "'-'",
    "STAR": "'*'",
    "MORETHAN": "'>'",
    "LESSTHAN": "'<'",
    "__ANON_0": "'>='",
    "__ANON_1": "'<='",
    "$END": "the end",
}


def parse(text: str) -> Condition:
    """Return the tree of `text`; raise ConditionError where it cannot be read."""
    if len(text) > LONGEST:
        raise ConditionError(f"a condition has at most {LONGEST} characters", 1, found=f"{len(text)} characters")
    text = text.replace("\n", " ")  # a line break is a blank like any other, and columns count through it
    refuse_later_forms(text)
    try:
        tree = _PARSER.parse(text)
    except UnexpectedInput as problem:
        _complain(problem, text)
    _refuse_deep(tree)
    return _condition(tree)


def _refuse_deep(tree: Node) -> None:
    """Complain of a tree that is nested too deeply, without calling itself."""
    level, depth = _children(tree), 1
    while level:
        if depth > DEEPEST:
            raise ConditionError(f"this is nested more than {DEEPEST} levels deep", _column(level[0]))
        level, depth = [child for node in level for child in _children(node)], depth + 1


def _complain(problem: UnexpectedInput, text: str) -> NoReturn:
    """Turn the parser's complaint into ours."""
    found, expected = "the end", set[str]()
    column = len(text) + 1
    if isinstance(problem, UnexpectedToken):
        expected = set(problem.accepts or problem.expected)
        if problem.token.type != "$END":
            found, column = f"'{problem.token}'", problem.token.column or 1
    elif isinstance(problem, UnexpectedCharacters):
        expected, column = set(problem.allowed or ()), problem.column
        found = f"'{text[problem.pos_in_stream :].split(maxsplit=1)[0]}'"
    words = _words(expected)
    raise ConditionError(f"{found} cannot stand here; expected {words}", column, found=found, expected=words)


def _words(expected: set[str]) -> str:
    """Return what was expected as one phrase."""
    words = sorted({_EXPECTED.get(name, f"'{name.lower()}'") for name in expected})
    return " or ".join([", ".join(words[:-1]), words[-1]]) if len(words) > 1 else "".join(words) or "something else"


def _column(node: Node | Token) -> int:
    column = node.column if isinstance(node, Token) else node.meta.column
    return column or 1


def _children(node: Node) -> list[Node]:
    return [child for child in node.children if isinstance(child, Tree)]


def _condition(node: Node) -> Condition:
    return _CONDITIONS[node.data](node) if node.data in _CONDITIONS else _not_a_condition(node)


def _not_a_condition(node: Node) -> NoReturn:
    raise ConditionError("a value alone is no condition; compare it, as in `level above 1.40 m`", _column(node))


def _conditions(node: Node) -> tuple[Condition, ...]:
    return tuple(_condition(child) for child in _children(node))


def _negation(node: Node) -> Condition:
    part = _children(node)[0]
    if part.data == "held":
        raise ConditionError(
            "`not … for …` can be read two ways; write `not (… for …)` or `(not …) for …`", _column(node)
        )
    return Not(_condition(part))


def _held(node: Node) -> Condition:
    part, duration = _children(node)
    return Held(_condition(part), _literal(duration))


def _comparison(node: Node) -> Condition:
    left, relation, right = _children(node)
    return Comparison(_term(left), Relation(relation.data.replace("_", " ")), _term(right), _column(node))


def _between(node: Node) -> Condition:
    value, low, high = (_term(child) for child in _children(node))
    return Between(value, low, high, _column(node))


def _named(make: type[Is | Status | Commanded]) -> "_Make":
    def build(node: Node) -> Condition:
        name, word = node.children
        return make(str(name), str(word), _column(node))

    return build


def _vote(node: Node) -> Condition:
    count, parts = node.children[0], _conditions(node)
    if not str(count).isdigit() or not 1 <= int(str(count)) <= len(parts):
        raise ConditionError(
            f"at least {count} of {len(parts)} conditions can never be decided; expected 1 to {len(parts)}",
            _column(node),
        )
    return AtLeast(int(str(count)), parts)


def _short_vote(node: Node) -> Condition:
    needed, total = (int(number) for number in str(node.children[0]).split("oo"))
    parts = _conditions(node)
    if total != len(parts) or not 1 <= needed <= total:
        found = f"{node.children[0]} with {len(parts)} conditions"
        raise ConditionError(f"{found}; expected as many conditions as the vote says", _column(node), found=found)
    return AtLeast(needed, parts)


def _term(node: Node) -> Term:
    match node.data:
        case "value":
            return _literal(node)
        case "name":
            return Name(str(node.children[0]), column=_column(node))
        case "plus" | "minus":
            left, right = (_term(child) for child in _children(node))
            return Sum(left, right, node.data == "minus")
        case "times":
            return _product(node)
        case _:
            raise ConditionError("a condition cannot stand where a value is expected", _column(node))


def _product(node: Node) -> Term:
    left, right = (_term(child) for child in _children(node))
    for factor, term in ((left, right), (right, left)):
        if isinstance(factor, Literal) and _is_plain(factor.text):
            return Product(float(factor.text), term)
    raise ConditionError("one side of `*` must be a plain number", _column(node))


def _is_plain(text: str) -> bool:
    return not any(letter.isalpha() or letter == "%" for letter in text.lower().replace("e", "", 1))


def _literal(node: Node) -> Literal:
    number, unit = node.children
    return Literal(f"{number} {unit}" if unit else str(number), column=_column(node))


_Make = Callable[[Node], Condition]

_CONDITIONS: dict[str, _Make] = {
    "either": lambda node: Or(_conditions(node)),
    "both": lambda node: And(_conditions(node)),
    "negation": _negation,
    "held": _held,
    "grouped": lambda node: _conditions(node)[0],
    "comparison": _comparison,
    "between": _between,
    "is_word": _named(Is),
    "is_status": _named(Status),
    "commanded": _named(Commanded),
    "vote": _vote,
    "short_vote": _short_vote,
}
