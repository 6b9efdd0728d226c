"""What a page must not do before it has loaded.

Until then Panel schedules what changes components, and a scheduled change can overtake a later
one: the words of an old study would stay. So whatever the user does early waits.
"""

from collections.abc import Callable

import panel as pn

__all__ = ["when_loaded"]


def when_loaded(callback: Callable[[], None]) -> None:
    """Call at once, or as soon as the current session's page has loaded."""
    if pn.state.loaded:
        callback()
    else:
        pn.state.onload(callback)
