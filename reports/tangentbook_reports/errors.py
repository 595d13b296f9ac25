"""The one error of this package that is about a report and not about its writer.

A slip of the program that makes a document raises ValueError itself.
"""


class UnreadableReport(ValueError):  # noqa: N818 (it names the outcome an audit states)
    """The text is no report: something in it cannot be held by a document.

    Usual causes are hand editing, a text cut off, and a file that is no report at all.

    Attributes:
        reason: What is in the way, without the line.
        line: Where it stands, counted from 1; None if it is missing rather than in the way.
    """

    def __init__(self, reason: str, line: int | None) -> None:
        super().__init__(reason, line)
        self.reason = reason
        self.line = line

    def __str__(self) -> str:
        return self.reason if self.line is None else f"line {self.line}: {self.reason}"
