"""Which known word a misspelt one was probably meant to be."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from difflib import SequenceMatcher, get_close_matches

# Two names count as nearly the same from this similarity on (difflib's ratio). At 0.9 one letter in
# ten may differ: "Alder Polls" and "Alder Poll" are caught, "North Survey" and "South Survey" are not.
NEARLY_SAME = 0.9


def close_spelling(word: str, known: Iterable[str]) -> str | None:
    """Find the known word nearest to ``word``, None where none is near; capitals do not count."""
    by_folded = {k.casefold(): k for k in known}
    found = get_close_matches(word.casefold(), by_folded, n=1, cutoff=0.6)
    return by_folded[found[0]] if found else None


def did_you_mean(word: str, known: Iterable[str], *, names: Mapping[str, str] | None = None) -> str:
    """Say ``Did you mean "HU"?`` or, where nothing is near, the known words (the first twelve).

    Parameters
    ----------
    names
        Full names of known words, by word: whoever wrote "Harbour Union" meant "HU".
    """
    words = list(known)
    by_name = {name: code for code, name in (names or {}).items()}
    named = close_spelling(word, by_name)
    near = by_name[named] if named is not None else close_spelling(word, words)
    if near is not None:
        return f'Did you mean "{near}"?'
    if not words:
        return ""
    more = f", … ({len(words)} in total)" if len(words) > 12 else ""
    return "Known: " + ", ".join(words[:12]) + more + "."


def _bare(name: str) -> str:
    return "".join(c for c in name.casefold() if c.isalnum())


def nearly_same(first: str, second: str) -> bool:
    """Tell whether two different names differ so little that one may be a slip of the other."""
    if first == second:
        return False
    a, b = _bare(first), _bare(second)
    if a == b:
        return True
    # A differing digit is a name of its own (Panel 1, Panel 2), never a slip.
    if "".join(c for c in a if c.isdigit()) != "".join(c for c in b if c.isdigit()):
        return False
    return SequenceMatcher(None, a, b, autojunk=False).ratio() >= NEARLY_SAME
