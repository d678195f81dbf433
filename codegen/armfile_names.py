"""Names in an arm file: which ones C can carry, and what to propose for one that is misspelt."""

from __future__ import annotations

import difflib
import re
from collections.abc import Iterable

from codegen.armfile_keys import LONGEST_NAME

# ISO/IEC 9899:1999, 6.4.1, and the later ones of 9899:2011 and 9899:2024.
_C_KEYWORDS = """
    auto break case char const continue default do double else enum extern float for goto if inline int long register
    restrict return short signed sizeof static struct switch typedef union unsigned void volatile while
    alignas alignof bool constexpr false nullptr static_assert thread_local true typeof typeof_unqual
"""
# ISO/IEC 14882:2020, table 5 (lex.key) and table 6 (lex.digraph); those of C are not repeated.
_CPP_KEYWORDS = """
    asm catch char8_t char16_t char32_t class concept consteval constinit const_cast co_await co_return co_yield
    decltype delete dynamic_cast explicit export friend mutable namespace new noexcept operator private protected
    public reinterpret_cast requires static_cast template this throw try typeid typename using virtual wchar_t
    and and_eq bitand bitor compl not not_eq or or_eq xor xor_eq
"""
KEYWORDS = frozenset((_C_KEYWORDS + _CPP_KEYWORDS).split())
IDENTIFIER_PATTERN = "[A-Za-z_][A-Za-z0-9_]*"
LABEL_PATTERN = "[A-Za-z0-9_]([A-Za-z0-9 _.-]*[A-Za-z0-9_])?"


def did_you_mean(word: str, accepted: Iterable[str]) -> str:
    """A hint with the accepted word that is closest, or "" when none is."""
    close = closest(word, accepted)
    return f"did you mean {quoted(close)}?" if close else ""


def quoted(word: str) -> str:
    """A word of the file as a message shows it: in quotes, short, whatever it holds."""
    return f'"{shortened("".join(sign if sign.isprintable() else repr(sign)[1:-1] for sign in word))}"'


def shortened(text: str) -> str:
    return text if len(text) <= 60 else f"{text[:57]}..."


def closest(word: str, accepted: Iterable[str]) -> str:
    spelt = {name.casefold(): name for name in sorted(accepted)}
    close = difflib.get_close_matches(word[: 2 * LONGEST_NAME].casefold(), sorted(spelt), n=1)
    return spelt[close[0]] if close else ""


def identifier_problem(name: str) -> tuple[str, str]:
    """What keeps `name` from being a C and C++ identifier of our own, and a hint; ("", "") when nothing does."""
    if len(name) > LONGEST_NAME:
        return f"has {len(name)} characters; at most {LONGEST_NAME} are accepted", "choose a shorter name"
    if not re.fullmatch(IDENTIFIER_PATTERN, name):
        return "is not a C identifier", _identifier_advice(name)
    if name in KEYWORDS:
        return "is a keyword of C or C++", f'write "{name}_arm", say'
    if re.match("__|_[A-Z]", name):
        return "is reserved for the C compiler", f'write "{name.lstrip("_") or "arm"}", say'
    return "", ""


def _identifier_advice(name: str) -> str:
    rule = "letters, digits and _ only, not beginning with a digit"
    mended = re.sub("[^A-Za-z0-9_]+", "_", name).strip("_")
    mended = mended if not mended[:1].isdigit() else f"arm_{mended}"
    return f'{rule}: write "{mended}", say' if mended and not any(identifier_problem(mended)) else rule


def label_problem(name: str) -> tuple[str, str]:
    """What keeps `name` from naming a joint. The name reaches comments of the C, so nothing in it may end one."""
    if not name:
        return "is empty", 'give it a name, or leave the key out for "joint1", "joint2", ...'
    if len(name) > LONGEST_NAME:
        return f"has {len(name)} characters; at most {LONGEST_NAME} are accepted", "choose a shorter name"
    if not re.fullmatch(LABEL_PATTERN, name):
        return "holds a character that is not accepted", "letters a-z, digits, _ and inside the name also space - ."
    return "", ""
