"""What many rasters have in common, said once."""

from __future__ import annotations

from collections.abc import Iterable

__all__ = ["gathered"]

_MOST_NAMED = 3


def gathered(notes: Iterable[tuple[str, str]], kind: str = "rasters") -> tuple[str, ...]:
    """Say each note once: with its name before it, or with how many it is about where these are more than three.

    Parameters
    ----------
    notes
        Pairs of a name and a note about it.
    kind
        What the named are.

    Returns
    -------
    tuple of str
        In the order in which the notes first appear.

    Examples
    --------
    >>> gathered([("a.tif", "old"), ("b.tif", "large"), ("c.tif", "old")])
    ('a.tif, c.tif: old', 'b.tif: large')
    >>> gathered((f"{number}.tif", "old") for number in range(23))
    ('23 rasters: old',)
    """
    about: dict[str, dict[str, None]] = {}
    for name, note in notes:
        about.setdefault(note, {})[name] = None
    return tuple(
        f"{', '.join(names) if len(names) <= _MOST_NAMED else f'{len(names)} {kind}'}: {note}"
        for note, names in about.items()
    )
