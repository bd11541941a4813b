"""What can go wrong, as a tree.

::

    GinnelError
    +-- ConfigError          a setting is missing, unknown or out of range
    +-- CaptureError         samples cannot be had
    |   +-- CaptureFormatError   a file is not what it claims to be
    |   +-- SourceLostError      a live source has gone, or sends nothing: try again
    |   +-- CaptureTimeError     nobody knows when it starts, or it overlaps another
    +-- ImportFormatError    a file of counts is not what it should be
    +-- ExportError          a file cannot be written
    +-- StoreError           the log cannot be read or written
        +-- StoreBusyError       locked or unreachable: try again
        +-- SpanRefusedError     contradicts what is stored: trying again will not help
        +-- StoreFullError       no room on its disk: trying again helps once there is
        +-- StoreDamagedError    the file is broken: `ginnel store restore`
        +-- SchemaMismatchError  made by another version: `ginnel store upgrade`

Each message is one line that says what, where and how to mend it.
"""


class GinnelError(Exception):
    """Anything that Ginnel reports in one clear line."""


class ConfigError(GinnelError):
    """A setting is missing, unknown or out of range."""


class CaptureError(GinnelError):
    """Samples cannot be had."""


class CaptureFormatError(CaptureError):
    """A file is not what it claims to be."""


class CaptureTimeError(CaptureError):
    """Nobody knows when a capture starts, or it overlaps another."""


class SourceLostError(CaptureError):
    """A live source has gone, or sends nothing; trying again may help."""


class ImportFormatError(GinnelError):
    """A file of counts that others made is not what it should be."""


class ExportError(GinnelError):
    """A file cannot be written."""


class StoreError(GinnelError):
    """The log cannot be read or written."""


class StoreBusyError(StoreError):
    """The store is locked or unreachable; trying again may help."""


class SpanRefusedError(StoreError):
    """A span contradicts what is stored; trying again will not help."""


class StoreFullError(StoreError):
    """There is no room on the store's disk; trying again helps once there is."""


class StoreDamagedError(StoreError):
    """The store's file is broken; `ginnel store restore` takes the last backup."""


class SchemaMismatchError(StoreError):
    """The store was made by another version; `ginnel store upgrade` mends it."""
