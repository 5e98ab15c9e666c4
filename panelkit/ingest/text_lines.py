"""Text of any usual encoding as batches of lines."""

import codecs
import io
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import TypeVar

from panelkit.errors import InputDataError
from panelkit.ingest.compression import BLOCK, compression_of, open_bytes
from panelkit.ingest.wording import counted
from panelkit.records import Finding

__all__ = ["UTF8", "Encoding", "Lines", "encoding_of", "read_lines"]

MOST_CHARACTERS = 128 * 2**20
"""Of one line; a million columns of 20 characters have 20 million."""

_MARKS = (
    (codecs.BOM_UTF32_LE, "utf-32"),
    (codecs.BOM_UTF32_BE, "utf-32"),
    (codecs.BOM_UTF16_LE, "utf-16"),
    (codecs.BOM_UTF16_BE, "utf-16"),
)
_UNDEFINED_IN_CP1252 = (b"\x81", b"\x8d", b"\x8f", b"\x90", b"\x9d")

Result = TypeVar("Result")


@dataclass(frozen=True, slots=True)
class Encoding:
    """How bytes are decoded, and why when the file itself does not say.

    Attributes
    ----------
    codec : str
        Python's name of the encoding.
    evidence : str
        Empty when the file is UTF-8 or carries a byte order mark.
    """

    codec: str
    evidence: str = ""

    def findings(self, where: str) -> list[Finding]:
        """Return the finding that says which encoding was assumed, if one was.

        Parameters
        ----------
        where : str
            The file, for the message.

        Returns
        -------
        list of Finding
            One or none.
        """
        if not self.evidence:
            return []
        name = "Windows-1252" if self.codec == "cp1252" else "Latin-1"
        return [
            Finding(
                code="encoding-assumed",
                severity="warning",
                where=where,
                message=f"the text is not UTF-8 ({self.evidence}) and was read as "
                f"{name} (Western European)",
                next_step="Check the names with accents or signs; save the file as "
                "UTF-8 to be sure.",
            )
        ]


UTF8 = Encoding("utf-8-sig")


def _marked(start: bytes) -> Encoding:
    for mark, codec in _MARKS:
        if start.startswith(mark):
            return Encoding(codec)
    return UTF8


def encoding_of(path: Path) -> Encoding:
    """Return the encoding of a text after all of it has been looked at.

    Parameters
    ----------
    path : Path
        Plain or compressed text.

    Returns
    -------
    Encoding
        By its byte order mark, else UTF-8 when all bytes are, else Windows-1252, or
        Latin-1 where that leaves bytes undefined.

    Raises
    ------
    InputDataError
        When the file cannot be read.
    """
    decoder = codecs.getincrementaldecoder("utf-8")()
    line = 1
    evidence = ""
    undefined = False
    with open_bytes(path) as stream:
        block = stream.read(BLOCK)
        by_mark = _marked(block)
        if by_mark is not UTF8:
            return by_mark
        while block:
            if not evidence:
                try:
                    decoder.decode(block)
                except UnicodeDecodeError as error:
                    line += error.object[: error.start].count(b"\n")
                    byte = error.object[error.start]
                    evidence = f"byte 0x{byte:02X} on line {line}"
                line += block.count(b"\n")
            undefined |= any(byte in block for byte in _UNDEFINED_IN_CP1252)
            block = stream.read(BLOCK)
    if not evidence:
        try:
            decoder.decode(b"", True)
        except UnicodeDecodeError:
            evidence = f"a character is cut off at the end of line {line}"
    if not evidence:
        return UTF8
    return Encoding("latin-1" if undefined else "cp1252", evidence)


class Lines:
    """One reading of a text: batches of whole lines, whatever ends them.

    Parameters
    ----------
    path : Path
        Plain or compressed text.
    encoding : Encoding
        How to decode it.

    Attributes
    ----------
    where : str
        The file's name, for messages.
    zero_bytes : int
        Zero characters that were left out at the end, known after the last batch.
    """

    def __init__(self, path: Path, encoding: Encoding) -> None:
        self.path = path
        self.where = path.name
        self.encoding = encoding
        self.zero_bytes = 0
        self._line = 1

    @property
    def compressed(self) -> bool:
        """Whether the file is larger than it seems."""
        with self.path.open("rb") as stream:
            return compression_of(stream.read(6)) is not None

    def _blocks(self) -> Iterator[str]:
        with open_bytes(self.path) as stream:
            block = stream.read(BLOCK)
            codec = _marked(block).codec if self.encoding is UTF8 else None
            decoder = io.IncrementalNewlineDecoder(
                codecs.getincrementaldecoder(codec or self.encoding.codec)(),
                translate=True,
            )
            while block:
                yield decoder.decode(block)
                block = stream.read(BLOCK)
            yield decoder.decode(b"", True)

    def __iter__(self) -> Iterator[tuple[int, list[str]]]:
        """Yield the number of a batch's first line and its lines, without ends.

        Yields
        ------
        number : int
            From 1.
        lines : list of str
            Blank ones too.

        Raises
        ------
        InputDataError
            When the file is damaged, holds zero bytes before its end, or has a line
            longer than any matrix needs.
        """
        carry: list[str] = []
        size = 0
        for block in self._blocks():
            text = self._without_zeros(block)
            if "\n" not in text:
                carry.append(text)
                size += len(text)
                if size > MOST_CHARACTERS:
                    raise _too_long(self.where, self._line)
                continue
            lines = text.split("\n")
            lines[0] = "".join([*carry, lines[0]])
            carry = [lines.pop()]
            size = len(carry[0])
            number = self._line
            self._line += len(lines)
            yield number, lines
        last = "".join(carry)
        if last:
            yield self._line, [last]

    def _without_zeros(self, text: str) -> str:
        if self.zero_bytes:  # nothing but more of them may follow
            left = text.strip("\0\n ")
            self.zero_bytes += text.count("\0")
        elif "\0" in text:
            head, _, tail = text.partition("\0")
            left = tail.strip("\0\n ")
            self.zero_bytes = text.count("\0")
            text = head
        else:
            return text
        if left:
            raise InputDataError(
                code="zero-byte-inside",
                where=self.where,
                what="there is a zero byte in or after line "
                f"{self._line + text.count(chr(10))}, with text after it",
                accepted="text without zero bytes is needed (at its end they are left "
                "out; UTF-16 needs a byte order mark)",
                next_step="Export or copy the file again",
            )
        return "" if text.strip("\0\n ") == "" else text

    def findings(self) -> list[Finding]:
        """Return what was noticed about the text itself.

        Returns
        -------
        list of Finding
            Encoding assumed, zero bytes at the end.
        """
        found = self.encoding.findings(self.where)
        if self.zero_bytes:
            found.append(
                Finding(
                    code="zero-bytes-at-end",
                    severity="warning",
                    where=self.where,
                    message=f"{counted(self.zero_bytes, 'zero byte', 'zero bytes')} "
                    "at the end of the file were left out",
                    next_step="Check that the file is complete: interrupted copies "
                    "end so.",
                )
            )
        return found


def _too_long(where: str, line: int) -> InputDataError:
    return InputDataError(
        code="line-too-long",
        where=f"{where}, line {line}",
        what=f"the line has more than {MOST_CHARACTERS:,} characters",
        accepted="a table has one line for each row",
        next_step="Check that the file is the table, with its line ends",
    )


def read_lines(path: Path, read: Callable[[Lines], Result]) -> Result:
    """Return what `read` makes of a text, decoded as the text turns out to be.

    Parameters
    ----------
    path : Path
        Plain or compressed text.
    read : callable
        Is given the `Lines`; called again when the text is found not to be UTF-8.

    Returns
    -------
    object
        What `read` returns.

    Raises
    ------
    InputDataError
        When the text is damaged.
    """
    try:
        return read(Lines(path, UTF8))
    except UnicodeDecodeError:
        pass
    try:
        return read(Lines(path, encoding_of(path)))
    except UnicodeDecodeError as error:
        raise InputDataError(
            code="text-damaged",
            where=path.name,
            what=f"the text says by its first bytes that it is {error.encoding} but "
            f"is not ({error.reason})",
            accepted="complete text in UTF-8 or UTF-16 is needed",
            next_step="Export or copy the file again, as UTF-8",
        ) from error
