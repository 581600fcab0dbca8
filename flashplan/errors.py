"""The one error that means: the input is wrong, and here is where."""


class InputError(ValueError):
    """Bad input from a person. Caught once, by the command line, which prints the message and exits with 2.

    message: what was found and what is accepted; where: the file and key path that it was found at, if any.
    """

    def __init__(self, message: str, where: str = "") -> None:
        self.message = message
        self.where = where
        super().__init__(f"{where}: {message}" if where else message)

    def __reduce__(self) -> tuple[type["InputError"], tuple[str, str]]:
        # Its parts, so that it comes back whole from a worker process.
        return InputError, (self.message, self.where)
