"""Times as the book stores them: UTC, ISO 8601 to the second, ending in Z; a time without offset is local."""

from datetime import UTC, date, datetime

from labbook.errors import Refusal


def now() -> str:
    """This moment, as stored."""
    return stored(datetime.now(UTC))


def stored(moment: datetime) -> str:
    """A datetime as stored; one without offset is local time."""
    return moment.astimezone(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")


def read_moment(field: str, text: str) -> str:
    """An ISO 8601 date and time as stored; Refusal for anything else."""
    try:
        return stored(datetime.fromisoformat(text.strip()))
    except ValueError:
        raise Refusal(field, text, "is not a date and time", "write e.g. 2026-03-01T14:32") from None
    except OverflowError:
        raise Refusal(field, text, "lies outside the calendar", "write e.g. 2026-03-01T14:32") from None


def read_date(field: str, text: str) -> str:
    """An ISO 8601 date, as stored; Refusal for anything else."""
    try:
        return date.fromisoformat(text.strip()).isoformat()
    except ValueError:
        raise Refusal(field, text, "is not a date", "write e.g. 2026-03-01") from None


def local(moment: str) -> datetime:
    """A stored time as local time with its offset."""
    return datetime.fromisoformat(moment).astimezone()


def day_number(text: str) -> float:
    """Days since 1970 of a stored time, or of a date taken at local noon."""
    if len(text) == 10:
        return datetime.fromisoformat(text + "T12:00").timestamp() / 86400
    return datetime.fromisoformat(text).timestamp() / 86400
