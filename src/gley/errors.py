"""The one exception a user meets: what is wrong, where, what is allowed, what to do."""


class GleyError(Exception):
    """A job that can't go on. The command line prints it as one line (two with the cure) and exits 1.

    Parameters
    ----------
    message : str
        What is wrong, naming file, sheet, cell and value where there is one.
    cure : str
        What the user can do about it.
    """

    def __init__(self, message: str, cure: str = "") -> None:
        super().__init__(message)
        self.message = message
        self.cure = cure

    def __str__(self) -> str:
        return f"{self.message} {self.cure}".strip()


class UsageError(GleyError):
    """The call itself is off (exit code 2): unknown name, missing choice, value out of its range."""
