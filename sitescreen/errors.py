"""Every error that sitescreen raises on purpose.

::

    SitescreenError
    ├── InputError (also ValueError)      a file or value that was handed in cannot be used
    │   ├── BriefError                    the brief, or the words of the call
    │   └── GridError                     coordinates, units or grids do not fit
    ├── ConfigError (also ValueError)     a settings file or zone profile is wrong
    └── OutputError (also OSError)        results cannot be written

Each one says three things: what was given, what is needed, the way out. The command line prints them as one line and
ends with exit code 2. Anything else that escapes is a fault of ours, keeps its traceback and ends with exit code 1.
"""


class SitescreenError(Exception):
    """An error in three parts that a planner can act on.

    Parameters
    ----------
    given : str
        What was found, with the file or value named. A full clause, no closing stop.
    needed : str
        What sitescreen needs instead.
    way_out : str
        What the user can do about it.
    """

    def __init__(self, given: str, needed: str, way_out: str) -> None:
        self.given = given
        self.needed = needed
        self.way_out = way_out
        super().__init__(f"{given}; {needed}. {way_out}.")

    def __reduce__(self) -> tuple[type["SitescreenError"], tuple[str, str, str]]:
        """Survive the trip between processes: the default rebuilds from the one joined message."""
        return type(self), (self.given, self.needed, self.way_out)


class InputError(SitescreenError, ValueError):
    """A file or value that was handed in cannot be used."""


class BriefError(InputError):
    """The brief, or the words of the call, cannot be used."""


class GridError(InputError):
    """Coordinates, units or grids do not fit together."""


class ConfigError(SitescreenError, ValueError):
    """A settings file or zone profile is wrong."""


class OutputError(SitescreenError, OSError):
    """Results cannot be written."""

    def __str__(self) -> str:  # OSError would print the arguments as a tuple
        return f"{self.given}; {self.needed}. {self.way_out}."
