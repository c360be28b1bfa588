"""Inert blocks of data for a page: text that no template and no browser can take for code.

Two kinds. A JSON block for what is small and should be readable in the file, and a packed block
(gzip, then base64) for columns, grids and lines. A packed block holds any number of named arrays and
lists of text::

    4 bytes   length of the header, little endian
    header    JSON in UTF-8: {"parts": [...], "texts": {...}, "facts": {...}}
    bytes     the arrays one after the other, each as planes: all lowest bytes, then all next, …

Planes of equal significance lie together because they compress far better that way.
"""

from __future__ import annotations

import base64
import json
import zlib
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

# Characters that could end a script element, open a comment or a template expression somewhere.
_JSON_ESCAPES = (
    ("&", "\\u0026"),
    ("<", "\\u003c"),
    (">", "\\u003e"),
    ("{{", "\\u007b\\u007b"),
    ("{%", "\\u007b%"),
    ("{#", "\\u007b#"),
)


def inert_json(data: object) -> str:
    r"""JSON in ASCII that holds neither markup nor template braces and reads back as `data`.

    Raises
    ------
    ValueError
        A number is not finite: JSON has no word for it; use None.

    Examples
    --------
    >>> inert_json("</script>{{7*7}}")
    '"\\u003c/script\\u003e\\u007b\\u007b7*7}}"'
    """
    text = json.dumps(data, ensure_ascii=True, allow_nan=False, separators=(",", ":"))
    for found, written in _JSON_ESCAPES:
        text = text.replace(found, written)
    return text


def byte_planes(codes: NDArray[Any]) -> bytes:
    """Bytes of unsigned integers of any shape, grouped by significance, lowest first."""
    flat = np.ascontiguousarray(codes).ravel()
    width = flat.dtype.itemsize
    little = flat.astype(flat.dtype.newbyteorder("<"), copy=False)
    return np.ascontiguousarray(little.view(np.uint8).reshape(-1, width).T).tobytes()


def pack(
    arrays: Mapping[str, NDArray[Any]],
    *,
    texts: Mapping[str, Sequence[str]] | None = None,
    facts: Mapping[str, Any] | None = None,
) -> str:
    """One packed block of named unsigned-integer arrays, lists of text and small facts, as base64.

    Parameters
    ----------
    arrays : mapping of str to ndarray
        uint8, uint16 or uint32, any shape; the shape is not kept.
    texts : mapping of str to sequence of str
        Lists of text, kept as they are.
    facts : mapping
        Anything small that JSON can hold.

    Returns
    -------
    str
        Base64; the same input gives the same text.
    """
    parts, body = [], []
    for name, values in arrays.items():
        if values.dtype.kind != "u":
            raise TypeError(f"array {name!r} is {values.dtype}, not an unsigned integer")
        parts.append({"name": name, "width": values.dtype.itemsize, "count": int(values.size)})
        body.append(byte_planes(values))
    head = {"parts": parts, "texts": {name: list(lines) for name, lines in (texts or {}).items()}}
    head["facts"] = dict(facts or {})
    header = json.dumps(head, ensure_ascii=False, allow_nan=False, separators=(",", ":")).encode(
        "utf-8", "replace"
    )
    raw = len(header).to_bytes(4, "little") + header + b"".join(body)
    return base64.b64encode(_gzip(raw, zlib.Z_DEFAULT_STRATEGY if texts else zlib.Z_FILTERED)).decode("ascii")


def _gzip(raw: bytes, strategy: int) -> bytes:
    """Gzip without the time of writing, so that equal content gives equal bytes.

    Level 6 is a tenth of level 9's time for a few percent of size; small differences, as grids and lines
    hold them, compress better with the strategy for filtered data.
    """
    packer = zlib.compressobj(6, zlib.DEFLATED, 16 + zlib.MAX_WBITS, zlib.DEF_MEM_LEVEL, strategy)
    return packer.compress(raw) + packer.flush()
