"""Every error that Plainlight raises on purpose.

TuiError                      something a person can mend; the text is one or two plain sentences
├── InputError (ValueError)   what was handed in cannot be used
│   ├── CoverageError         a spectrum or template does not reach the whole band
│   ├── TableError            a table as a whole cannot be read (a bad row is refused, not raised)
│   ├── SettingError          no such setting, or a value outside its range
│   └── UnknownNameError      no such candidate, check, band or handle
├── TemplateError             the photosphere source lacks what a fit needs
└── StoreError                the queue file refused: locked, damaged, newer, or a rule of the log
    ├── SealError             asked for what the reviewer may not yet see
    └── HandleError           an unknown handle, or one handle for two people
"""

from __future__ import annotations


def reason_of(error: BaseException) -> str:
    """Why something outside the program failed, in plain words without a full stop, for the end of a sentence.

    >>> reason_of(FileNotFoundError(2, "No such file or directory")), reason_of(KeyError("x"))
    ('no such file or directory', 'its content is not what was expected')
    """
    if isinstance(error, UnicodeDecodeError):
        return f"it is not UTF-8 text from byte {error.start + 1} on"
    if isinstance(error, OSError) and error.strerror:
        return error.strerror[0].lower() + error.strerror[1:]
    if isinstance(error, MemoryError):
        return "it needs more memory than there is"
    return "its content is not what was expected"


class TuiError(Exception):
    """Base of all; `str()` is fit to be shown to a person."""


class InputError(TuiError, ValueError):
    """Something handed in cannot be used."""


class CoverageError(InputError):
    """A spectrum does not reach both ends of a band."""

    def __init__(self, band_name: str, need_um: tuple[float, float], have_um: tuple[float, float]) -> None:
        self.band_name, self.need_um, self.have_um = band_name, need_um, have_um
        super().__init__(
            f"{band_name} needs {need_um[0]:.4g} to {need_um[1]:.4g} micron, "
            f"the spectrum has {have_um[0]:.4g} to {have_um[1]:.4g}."
        )


class TableError(InputError):
    """A table cannot be read at all."""

    def __init__(self, path: str, reason: str) -> None:
        self.path, self.reason = path, reason
        super().__init__(f"{path}: {reason}")


class SettingError(InputError):
    """No such setting, or a value outside its range."""

    def __init__(self, setting: str, reason: str) -> None:
        self.setting, self.reason = setting, reason
        super().__init__(f"Setting {setting}: {reason}")


class UnknownNameError(InputError):
    """No such candidate, check, band or handle."""

    def __init__(self, what: str, name: str, hint: str = "") -> None:
        self.what, self.name, self.hint = what, name, hint
        super().__init__(f"There is no {what} {name!r}." + (f" {hint}" if hint else ""))


class TemplateError(TuiError):
    """The photosphere source lacks what a fit needs."""


class StoreError(TuiError):
    """The queue file refused."""


class SealError(StoreError):
    """Asked for what the reviewer may not yet see."""


class HandleError(StoreError):
    """An unknown handle, or one handle for two people."""

    def __init__(self, handle: str, reason: str) -> None:
        self.handle, self.reason = handle, reason
        super().__init__(reason)
