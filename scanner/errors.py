"""The errors a user can meet: each message is one line with what, where, the bound and the remedy.

::

    ScannerError            the request is wrong or cannot be met (exit status 2)
    ├── TableError          a table that cannot be built or used
    ├── StudyError          a study file that does not say what it must
    ├── StoreError          a store that is missing, foreign or damaged
    └── EngineError         the workers or their scheduler cannot be had
"""


class ScannerError(Exception):
    """Base of all errors meant for the user's eyes; the message is one line."""

    exit_status = 2


class TableError(ScannerError):
    """A table cannot be built from these parameters, or cannot be used for this."""


class StudyError(ScannerError):
    """A study file is not valid; the message names the key, the value and the bound."""


class StoreError(ScannerError):
    """A store is missing, belongs to another study, or is damaged."""


class EngineError(ScannerError):
    """Workers or their scheduler cannot be reached or started."""
