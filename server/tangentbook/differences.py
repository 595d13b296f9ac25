"""Where two reports of the same call differ: values by JSON Pointer, the rest by line.

Numbers that are exact or proved come out as the same characters everywhere. Others are held to
their printed digits: a difference of one unit in the last of them is called soft.
"""

from __future__ import annotations

import difflib
import json
import math
import re
from dataclasses import dataclass
from itertools import zip_longest
from typing import TYPE_CHECKING, Any

from tangentbook.contract.plain import is_array, is_number, is_object, pointer_to

if TYPE_CHECKING:
    from collections.abc import Iterator

_FIRM = {"exact", "proved"}
_NUMBER = re.compile(r"-?\d+(?:\.\d+)?(?:[eE][-+]?\d+)?")
_FEWEST_DIGITS = 3
"""A number printed shorter counts as printed with this many digits: 3 and 4 are not alike."""

_ABSENT = "(nothing)"


@dataclass(frozen=True, slots=True, kw_only=True)
class Difference:
    """One place where the stated report and the one found now differ."""

    where: str
    stated: Any
    found: Any
    soft: bool = False
    """A number that is not proved, within its printed digits."""

    def as_dict(self) -> dict[str, Any]:
        """As printed by `--json`."""
        return {"where": self.where, "stated": self.stated, "found": self.found}

    def __str__(self) -> str:
        stated, found = (json.dumps(v, ensure_ascii=False) for v in (self.stated, self.found))
        return f"{self.where}: stated {_cut(stated)}, found {_cut(found)}"


def _cut(text: str) -> str:
    return text if len(text) <= 160 else text[:159] + "…"


def of_values(
    stated: object, found: object, *, pointer: str = "", firm: bool = False
) -> Iterator[Difference]:
    """The differing values of two results.

    Args:
        stated: the result a report carries.
        found: the result of its call now.
        pointer: where the two stand.
        firm: whether the nearest `known` above says exact or proved.
    """
    if is_object(stated) and is_object(found):
        known = stated.get("known")
        firm = known in _FIRM if known is not None else firm
        for key in dict.fromkeys([*stated, *found]):
            at = pointer_to(pointer, key)
            if key in stated and key in found:
                yield from of_values(stated[key], found[key], pointer=at, firm=firm)
            else:
                yield Difference(
                    where=at, stated=stated.get(key, _ABSENT), found=found.get(key, _ABSENT)
                )
    elif is_array(stated) and is_array(found):
        by_code = _keyed(stated), _keyed(found)
        if by_code[0] is not None and by_code[1] is not None:
            yield from of_values(*by_code, pointer=pointer, firm=firm)
            return
        pairs = zip_longest(stated, found, fillvalue=_ABSENT)
        for index, pair in enumerate(pairs):
            yield from of_values(*pair, pointer=pointer_to(pointer, index), firm=firm)
    elif not _same(stated, found):
        soft = not firm and is_number(stated) and is_number(found) and alike(stated, found)
        yield Difference(where=pointer or "/", stated=stated, found=found, soft=soft)


def _same(stated: object, found: object) -> bool:
    """Equal as JSON values: 1 and 1.0 are one number, 1 and true are not."""
    return stated == found and isinstance(stated, bool) == isinstance(found, bool)


def of_lines(
    stated: str, found: str, *, where: str, soft: bool, ignore: tuple[str, ...] = ()
) -> Iterator[Difference]:
    """The differing lines of two texts.

    Args:
        stated: the text on disk.
        found: the text rendered now.
        where: what the lines are of, as "line" or a file name.
        soft: whether numbers may differ in their last digit.
        ignore: lines that hold one of these texts differ for a reason that is shown elsewhere.
    """
    for number, old, new in _aligned(stated.split("\n"), found.split("\n")):
        if old == new or any(text in line for text in ignore for line in (old, new) if line):
            continue
        yield Difference(
            where=f"{where} {number}",
            stated=_ABSENT if old is None else old,
            found=_ABSENT if new is None else new,
            soft=soft and old is not None and new is not None and _lines_alike(old, new),
        )


def _aligned(stated: list[str], found: list[str]) -> Iterator[tuple[int, str | None, str | None]]:
    """Line number, stated and found line of every place that differs; None where one is missing."""
    matcher = difflib.SequenceMatcher(a=stated, b=found, autojunk=False)
    for tag, a, a_end, b, b_end in matcher.get_opcodes():
        if tag != "equal":
            for k, (old, new) in enumerate(zip_longest(stated[a:a_end], found[b:b_end])):
                yield min(a + k, len(stated)) + 1, old, new


def _keyed(items: list[Any]) -> dict[str, Any] | None:
    """Records with a code (checks, cautions) by code and point, so that a missing one is named."""
    keyed: dict[str, Any] = {}
    for item in items:
        if not is_object(item) or "code" not in item:
            return None
        base = "/".join(str(item[k]) for k in ("code", "point") if k in item)
        key, count = base, 2
        while key in keyed:
            key, count = f"{base} ({count})", count + 1
        keyed[key] = item
    return keyed or None


def _lines_alike(stated: str, found: str) -> bool:
    if _NUMBER.sub("#", stated) != _NUMBER.sub("#", found):
        return False
    pairs = zip(_NUMBER.findall(stated), _NUMBER.findall(found), strict=True)
    return all(old == new or _texts_alike(old, new) for old, new in pairs)


def _texts_alike(stated: str, found: str) -> bool:
    return alike(float(stated), float(found), digits=max(_digits(stated), _digits(found)))


def alike(stated: float, found: float, *, digits: int | None = None) -> bool:
    """Whether two numbers differ by one unit at most in the last printed digit of the longer.

    Args:
        stated: one number.
        found: the other.
        digits: significant digits printed; by default as many as their shortest form has.
    """
    size = max(abs(stated), abs(found))
    if stated == found or not math.isfinite(size):
        return stated == found
    printed = digits or max(_digits(repr(float(stated))), _digits(repr(float(found))))
    unit = 10.0 ** (math.floor(math.log10(size)) + 1 - max(printed, _FEWEST_DIGITS))
    return abs(stated - found) <= 1.001 * unit  # the unit itself is no binary number


def _digits(text: str) -> int:
    mantissa = re.split("[eE]", text)[0].lstrip("-").replace(".", "")
    return len(mantissa.strip("0")) or 1
