"""What goes wrong in calc, as exceptions that name the argument, its range and the value."""


class CalcError(ValueError):
    """Any refusal of calc."""


class OutOfRangeError(CalcError):
    """A value lies outside the range for which the equation was published."""


class FitError(CalcError):
    """A fit was asked of data that cannot carry it."""
