"""Times as the book stores them: UTC, ISO 8601 to the second, ending in Z; a time without offset is local."""

from datetime import UTC, date, datetime

from labbook.errors import Refusal

# nobody logs beyond them, and within them a time can be shown in any zone
FIRST_YEAR, LAST_YEAR = "1000", "9000"


def now() -> str:
    """This moment, as stored."""
    return stored(datetime.now(UTC))


def stored(moment: datetime) -> str:
    """A datetime as stored; one without offset is local time."""
    return moment.astimezone(UTC).replace(tzinfo=None).isoformat(timespec="seconds") + "Z"


def read_moment(field: str, text: str) -> str:
    """An ISO 8601 date and time as stored; Refusal for anything else."""
    try:
        moment = stored(datetime.fromisoformat(text.strip()))
    except ValueError:
        raise Refusal(field, text, "is not a date and time", "write e.g. 2026-03-01T14:32") from None
    except OverflowError:
        moment = ""
    if not FIRST_YEAR <= moment[:4] < LAST_YEAR:
        raise Refusal(field, text, "lies outside the calendar", "write e.g. 2026-03-01T14:32")
    return moment


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
