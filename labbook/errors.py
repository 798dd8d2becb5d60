"""What labbook refuses, and how it is said: one base class, and texts built from fields."""


class LabbookError(Exception):
    """Base of every error that labbook raises on purpose."""


class Refusal(LabbookError, ValueError):
    """One refused input.

    field: the key, column or argument; typed: what was given (None when nothing was);
    reason: why it is refused; remedy: what would do (may be empty).
    """

    def __init__(self, field: str, typed: object, reason: str, remedy: str = ""):
        self.field = field
        self.typed = typed
        self.reason = reason
        self.remedy = remedy
        super().__init__(field, typed, reason, remedy)

    def __str__(self) -> str:
        given = "" if self.typed is None else f" {str(self.typed)!r}"
        tail = f"; {self.remedy}" if self.remedy else ""
        return f"{self.field}{given}: {self.reason}{tail}."


class Refusals(LabbookError, ValueError):
    """Several refused inputs of one act, said together; nothing of the act was written."""

    def __init__(self, findings: list[Refusal]):
        self.findings = findings
        super().__init__(findings)

    def __str__(self) -> str:
        return "\n".join(str(finding) for finding in self.findings)


class Unconfirmed(LabbookError):
    """Warnings that want one confirmation; nothing was written.

    warnings: one sentence each; fields: the key that each is about.
    """

    def __init__(self, warnings: list[str], fields: list[str]):
        self.warnings = warnings
        self.fields = fields
        super().__init__(warnings, fields)

    def __str__(self) -> str:
        return "\n".join(self.warnings)


class BookProblem(LabbookError):
    """A file or database that cannot serve as a book: missing, foreign, newer, locked, full."""
