"""A small grammar of texts: rules with alternatives, and careless hands that alter what they give."""

from __future__ import annotations

import random
import re

_RULE = re.compile(r"<(\w+)>")
_STRAY = list("\0\t\r\n\x0b\u00a0\u2013\u2212\ufeff\u2028\u0661\u00b2δ()[]{}<>,;:.-+*/\\'\"=#%$|~^_&0123456789CHNJmqd") + [
    "1e999", "nan", "-0", "9" * 30, "((((", "))))", "0.", ".5", "13C NMR", "\U0001d6ff", "\ud800", "\x1f\x8b", "V3000", "\n\n\n",
]  # fmt: skip


def write_text(rules: dict[str, list[str]], chance: random.Random, start: str = "start", depth: int = 12) -> str:
    """Expand `start`: `<rule>` in an alternative stands for one alternative of that rule; the first ends a recursion."""
    alternatives = rules[start]
    chosen = alternatives[0] if depth <= 0 else chance.choice(alternatives)
    return _RULE.sub(lambda found: write_text(rules, chance, found[1], depth - 1) if found[1] in rules else found[0], chosen)


def alter_text(text: str, chance: random.Random, most: int = 4) -> str:
    """Drop, double, move, replace or insert up to `most` pieces."""
    for _ in range(chance.randrange(most + 1)):
        at = chance.randrange(len(text) + 1)
        end = min(len(text), at + chance.choice((1, 1, 1, 3, 12, 80)))
        piece = text[at:end]
        how = chance.randrange(5)
        if how == 0:
            text = text[:at] + text[end:]
        elif how == 1:
            text = text[:at] + piece * chance.choice((2, 3, 30)) + text[end:]
        elif how == 2:
            text = text[:at] + chance.choice(_STRAY) + text[end:]
        elif how == 3:
            text = text[:at] + chance.choice(_STRAY) + text[at:]
        else:
            to = chance.randrange(len(text) + 1)
            text = text[:to] + piece + text[to:]
    return text[:50_000]
