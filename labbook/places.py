"""Where a user's books live, and who acts when nobody is named."""

import getpass
import os
from pathlib import Path

from platformdirs import user_data_path

DEMO = "demo.db"
OWN = "bench.db"


def data_folder() -> Path:
    """Where a user's books live on this system."""
    return user_data_path("labbook", appauthor=False)


def default_book() -> str:
    """The book that is meant when none is named: LABBOOK_BOOK, else bench.db in the user's data folder."""
    return os.environ.get("LABBOOK_BOOK") or str(data_folder() / OWN)


def current_handle() -> str:
    """Who acts when nobody is named: LABBOOK_BY, else the system user."""
    try:
        return os.environ.get("LABBOOK_BY") or getpass.getuser()
    except (KeyError, OSError, ImportError):
        return ""  # a user without a name, as in a container: the act then asks for --by
