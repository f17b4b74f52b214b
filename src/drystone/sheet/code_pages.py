"""Text of bytes that are not UTF-8: which of two older code pages fits better.

Spreadsheet programs on Windows write the Western European code page (Windows-1252); older ones on
a Macintosh write Mac Roman. Both give every byte a letter or a sign, so the neighbours decide:
inside a word a letter is likely and a sign is not.
"""

from __future__ import annotations

WINDOWS, MACINTOSH = "cp1252", "mac_roman"
NAMES = {WINDOWS: "the Western European code page (Windows-1252)", MACINTOSH: "Mac Roman"}
_SIGNS_IN_WORDS = frozenset("'’‘-–")
_COMMON_SIGNS = frozenset("±°µ·×²³–—’‘“”…%€£§½¼¾≤≥≠∆Ωπ•®©«» \xa0")
_MOST = 20_000  # bytes above 127 that are looked at


def decode_old(content: bytes) -> tuple[str, str] | None:
    r"""Text of ``content`` and its code page; None when neither can be right.

    Examples
    --------
    >>> decode_old(b"M\xfcller")
    ('Müller', 'cp1252')
    >>> decode_old(b"M\x9fller")
    ('Müller', 'mac_roman')
    """
    places = [place for place, byte in enumerate(content) if byte > 127][:_MOST]
    scored = []
    for name in (WINDOWS, MACINTOSH):
        try:
            text = content.decode(name)
        except UnicodeDecodeError:
            continue
        scored.append((sum(_fits(text, place) for place in places), name == WINDOWS, text, name))
    if not scored:
        return None
    score, _, text, name = max(scored)
    return None if score < 0 else (text, name)


def _fits(text: str, place: int) -> int:
    """How well a character sits between its neighbours; one byte is one character here."""
    sign = text[place]
    before, after = text[place - 1 : place], text[place + 1 : place + 2]
    inside = before.isalpha() and after.isalpha()
    if sign.isalpha():
        mixed = sign.isupper() and (before.islower() or (before.isalpha() and after.islower()))
        lonely = not _plain_letter(before) and not _plain_letter(after)
        return -1 if mixed or lonely else 1
    if inside:
        return 0 if sign in _SIGNS_IN_WORDS else -2
    return 1 if sign in _COMMON_SIGNS else -1


def _plain_letter(sign: str) -> bool:
    return sign.isascii() and sign.isalpha()
