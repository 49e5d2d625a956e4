"""What can go wrong below the web layer, each with the data to recover from it. They travel between processes."""

from collections.abc import Sequence


class UnknownName(LookupError):
    """A name that the catalogue or a level does not have, with the nearest ones it has."""

    def __init__(self, kind: str, given: str, nearest: Sequence[str] = (), hint: str = "") -> None:
        self.kind, self.given, self.nearest, self.hint = kind, given, tuple(nearest), hint
        near = f"; nearest: {', '.join(self.nearest)}" if self.nearest else ""
        super().__init__(f"no {kind} {given!r}{near}{'; ' + hint if hint else ''}")

    def __reduce__(self) -> tuple[type, tuple[object, ...]]:
        return type(self), (self.kind, self.given, self.nearest, self.hint)


class NotPublished(LookupError):
    """A constant that the answer needs and the catalogue does not have."""

    def __init__(self, constant: str, owner: str, hint: str = "") -> None:
        self.constant, self.owner, self.hint = constant, owner, hint
        super().__init__(f"{constant} of {owner} is not in the catalogue{'; ' + hint if hint else ''}")

    def __reduce__(self) -> tuple[type, tuple[object, ...]]:
        return type(self), (self.constant, self.owner, self.hint)


class OutsideValidity(ValueError):
    """A value that the model or the request cannot take, with the range or the rule it breaks."""

    def __init__(self, parameter: str, given: object, allowed: str) -> None:
        self.parameter, self.given, self.allowed = parameter, given, allowed
        super().__init__(f"{parameter} = {given}: {allowed}")

    def __reduce__(self) -> tuple[type, tuple[object, ...]]:
        return type(self), (self.parameter, self.given, self.allowed)


class DataError(ValueError):
    """A data file that does not hold what the schema or the catalogue needs: which file, which key, why."""

    def __init__(self, file: str, key: str, reason: str) -> None:
        self.file, self.key, self.reason = file, key, reason
        super().__init__(f"{file}: {key + ': ' if key else ''}{reason}")


class OverlayError(DataError):
    """A lab's overlay that cannot be used; nothing of it was applied."""
